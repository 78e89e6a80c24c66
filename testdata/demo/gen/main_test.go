package main

import (
	"bytes"
	"errors"
	"io"
	"io/fs"
	"os"
	"path"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

const demo = ".." // the committed files

// written by hand, below the demo's folder. The generator itself is apart.
var byHand = []string{".gitattributes", "README.md", "books.toml", "budgetcheck.toml"}

func TestCommittedFilesAreTheGenerated(t *testing.T) {
	again := t.TempDir()
	require.NoError(t, write(demo, again))
	names := tree(t, again)
	require.NotEmpty(t, names)
	for _, name := range names {
		want, got := read(t, again, name), read(t, demo, name)
		// Not require.Equal: it would print whole files.
		require.True(t, bytes.Equal(want, got), "%s differs; run go generate ./testdata/demo/gen", name)
	}
}

func TestEveryFileIsAccountedFor(t *testing.T) {
	again := t.TempDir()
	require.NoError(t, write(demo, again))
	var data []string
	for _, name := range tree(t, demo) {
		if path.Dir(name) == "gen" {
			require.Equal(t, ".go", path.Ext(name), "%s: only the program stands here", name)
			continue
		}
		data = append(data, name)
	}
	require.ElementsMatch(t, append(tree(t, again), byHand...), data)
}

func TestDemoIsSmall(t *testing.T) {
	const most = 3_000_000
	size := 0
	for _, name := range tree(t, demo) {
		size += len(read(t, demo, name))
	}
	require.Less(t, size, most)
}

func TestSeriesAreWholeAndPlausible(t *testing.T) {
	for _, z := range zones() {
		f, err := grid.ReadCSV(bytes.NewReader(read(t, demo, z.file)), z.file, grid.Columns{})
		require.NoError(t, err)
		require.Zero(t, f.Findings.Len(), z.file)
		s := grid.NewSet(grid.Direct, f).Series(z.name, grid.Average)
		from, to := s.Span()
		require.Equal(t, seriesStart, from)
		require.Equal(t, z.until, to)
		require.Len(t, s.Steps(), int(to.Sub(from)/unit.Hour), "hours without a hole")
		for _, step := range s.Steps() {
			require.True(t, step.I >= 15 && step.I <= 800, "%s at %s: %v", z.name, step.From, step.I)
		}
	}
}

func TestRecordsHoldTogether(t *testing.T) {
	met := 0
	for _, r := range append(baseRuns(), headRuns()...) {
		for _, s := range r.seats {
			lines := linesOf(t, s.file)
			first, last := lines[0], lines[len(lines)-1]
			require.Equal(t, r.open.Run, first.Open.Run, s.file)
			require.Equal(t, record.OK, last.Close.Outcome, s.file)
			requireProgress(t, r.job, lines)
			requirePlausible(t, lines)
			met++
		}
	}
	require.Equal(t, len(baseRuns())+3, met)
}

// A head run that ended within its series would have no expected tail, and one
// without its gap no filled energy.
func TestHeadHasItsFlaws(t *testing.T) {
	for n, r := range headRuns() {
		for _, s := range r.seats {
			lines := linesOf(t, s.file)
			require.Greater(t, lines[len(lines)-1].At, zones()[n].until, s.file)
			require.Equal(t, s.outage.meter != "", longestSilence(lines) > 2*unit.Minute, s.file)
		}
	}
}

func requireProgress(t *testing.T, j job, lines []record.Line) {
	t.Helper()
	const least = 20 // work lines; a pilot is projected from as many
	var work []record.Work
	for _, l := range lines {
		if l.Work != nil {
			work = append(work, *l.Work)
		}
	}
	require.GreaterOrEqual(t, len(work), least)
	require.Equal(t, record.Work{Unit: j.unit, Done: j.planned, Planned: j.planned}, work[len(work)-1])
}

func requirePlausible(t *testing.T, lines []record.Line) {
	t.Helper()
	for _, l := range lines {
		if l.Kind == record.KindPower {
			require.True(t, l.Power >= 90 && l.Power <= 420, "line %d: %s", l.No, l.Power)
		}
	}
}

// longestSilence is the longest time between two readings of one meter.
func longestSilence(lines []record.Line) (longest unit.Duration) {
	last := map[int]unit.Instant{}
	for _, l := range lines {
		if l.Kind != record.KindPower {
			continue
		}
		if before, ok := last[l.Meter]; ok {
			longest = max(longest, l.At.Sub(before))
		}
		last[l.Meter] = l.At
	}
	return longest
}

// linesOf reads a committed record in which nothing may be wrong.
func linesOf(t *testing.T, name string) (lines []record.Line) {
	t.Helper()
	r, err := record.NewReader(bytes.NewReader(read(t, demo, name)), name)
	require.NoError(t, err)
	for {
		l, err := r.Next()
		if errors.Is(err, io.EOF) {
			break
		}
		require.NoError(t, err)
		lines = append(lines, *l)
	}
	require.NoError(t, r.Close())
	require.Empty(t, r.Findings().Lines())
	require.Empty(t, r.Unknown().Lines())
	require.Empty(t, r.Notes())
	require.NotEmpty(t, lines)
	return lines
}

func read(t *testing.T, dir, name string) []byte {
	t.Helper()
	content, err := os.ReadFile(filepath.Join(dir, filepath.FromSlash(name)))
	require.NoError(t, err)
	return content
}

// tree is the files below dir, with slashes.
func tree(t *testing.T, dir string) (names []string) {
	t.Helper()
	require.NoError(t, filepath.WalkDir(dir, func(p string, d fs.DirEntry, err error) error {
		if err == nil && !d.IsDir() {
			names = append(names, strings.TrimPrefix(filepath.ToSlash(p), filepath.ToSlash(dir)+"/"))
		}
		return err
	}))
	return names
}
