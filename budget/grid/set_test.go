package grid_test

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/grid"
)

// TestOverlapInFile: inside one file an hour stands once, or it is a finding:
// which of the two rows holds would be a guess.
func TestOverlapInFile(t *testing.T) {
	for name, c := range map[string]struct {
		second grid.Interval
		wrong  bool
	}{
		"the same row":            {step(1, 2, 412), true},
		"the same span":           {step(1, 2, 98), true},
		"over its start":          {step(0, 1.5, 98), true},
		"over its end":            {step(1.5, 3, 98), true},
		"inside":                  {step(1.25, 1.75, 98), true},
		"around":                  {step(0, 3, 98), true},
		"a nanosecond over start": {grid.Interval{From: hours(0), To: hours(1) + 1, I: 98}, true},
		"a nanosecond over end":   {grid.Interval{From: hours(2) - 1, To: hours(3), I: 98}, true},
		"touching its start":      {step(0, 1, 98), false},
		"touching its end":        {step(2, 3, 98), false},
		"apart":                   {step(5, 6, 98), false},
		"a nanosecond before it":  {grid.Interval{From: hours(1) - 1, To: hours(1), I: 98}, false},
	} {
		t.Run(name, func(t *testing.T) {
			f := read(t, "north.csv", header+rows("NORTH", grid.Average, step(1, 2, 412), c.second))
			set := grid.NewSet(grid.Direct, f)
			inOrder(t, set.Series("NORTH", grid.Average))
			if !c.wrong {
				assert.Empty(t, f.Findings.Lines())
				assert.Nil(t, set.Broken("NORTH"))
				return
			}
			oneFinding(t, f, 3, "line 2")
			assert.NotNil(t, set.Broken("NORTH"))
		})
	}
}

// TestFactorsApart: average and marginal rows of one hour are two series, in
// one file and across files, and neither shows in the other.
func TestFactorsApart(t *testing.T) {
	both := clean(t, "both.csv", header+rows("NORTH", grid.Average, step(0, 2, 412))+rows("NORTH", grid.Marginal, step(1, 3, 700)))
	later := clean(t, "later.csv", header+rows("NORTH", grid.Marginal, step(2, 4, 710)))
	set := grid.NewSet(grid.Lifecycle, both, later)
	average, marginal := set.Series("NORTH", grid.Average), set.Series("NORTH", grid.Marginal)
	assert.Equal(t, []grid.Interval{step(0, 2, 412)}, average.Steps())
	assert.Equal(t, []grid.Interval{step(1, 2, 700), step(2, 4, 710)}, marginal.Steps())
	assert.Equal(t, []*grid.Series{average, marginal}, set.All())
	assert.Equal(t, grid.Average, average.Factor)
	assert.Equal(t, grid.Marginal, marginal.Factor)
	assert.Equal(t, grid.Lifecycle, average.Boundary)
	assert.Equal(t, "NORTH", marginal.Zone)
	assert.Nil(t, set.Series("SOUTH", grid.Average))
}

// TestAcrossFiles: the same row twice is one row; where files differ the later
// one counts, which is said once for each series.
func TestAcrossFiles(t *testing.T) {
	file := func(name string, steps ...grid.Interval) *grid.File {
		return clean(t, name, header+rows("NORTH", grid.Average, steps...))
	}
	for name, c := range map[string]struct {
		files []*grid.File
		want  []grid.Interval
		note  string
	}{
		"the same rows": {
			[]*grid.File{file("a.csv", step(0, 1, 1), step(1, 2, 2)), file("b.csv", step(0, 1, 1), step(1, 2, 2))},
			[]grid.Interval{step(0, 1, 1), step(1, 2, 2)}, ""},
		"one after the other": {
			[]*grid.File{file("b.csv", step(1, 2, 2)), file("a.csv", step(0, 1, 1))},
			[]grid.Interval{step(0, 1, 1), step(1, 2, 2)}, ""},
		"a hole filled": {
			[]*grid.File{file("a.csv", step(0, 1, 1), step(2, 3, 3)), file("b.csv", step(1, 2, 2))},
			[]grid.Interval{step(0, 1, 1), step(1, 2, 2), step(2, 3, 3)}, ""},
		"one hour differs": {
			[]*grid.File{file("a.csv", step(0, 1, 1), step(1, 2, 2)), file("b.csv", step(1, 2, 9), step(2, 3, 3))},
			[]grid.Interval{step(0, 1, 1), step(1, 2, 9), step(2, 3, 3)}, "b.csv differs from an earlier file for zone NORTH (average) from 2031-03-01T01:00:00Z on"},
		"the other order": {
			[]*grid.File{file("b.csv", step(1, 2, 9), step(2, 3, 3)), file("a.csv", step(0, 1, 1), step(1, 2, 2))},
			[]grid.Interval{step(0, 1, 1), step(1, 2, 2), step(2, 3, 3)}, "a.csv differs"},
		"finer steps inside": {
			[]*grid.File{file("a.csv", step(0, 2, 1)), file("b.csv", step(0.5, 1, 9))},
			[]grid.Interval{step(0, 0.5, 1), step(0.5, 1, 9), step(1, 2, 1)}, "b.csv differs"},
		"a coarse step over all": {
			[]*grid.File{file("a.csv", step(0, 1, 1), step(1, 2, 2), step(3, 4, 4)), file("b.csv", step(0.5, 5, 9))},
			[]grid.Interval{step(0, 0.5, 1), step(0.5, 5, 9)}, "b.csv differs"},
		"three that differ": {
			[]*grid.File{file("a.csv", step(0, 1, 1)), file("b.csv", step(0, 1, 2)), file("c.csv", step(0, 1, 3))},
			[]grid.Interval{step(0, 1, 3)}, "b.csv differs"},
	} {
		t.Run(name, func(t *testing.T) {
			set := grid.NewSet(grid.Direct, c.files...)
			assert.Equal(t, c.want, set.Series("NORTH", grid.Average).Steps())
			if c.note == "" {
				assert.Empty(t, set.Notes())
				return
			}
			require.Len(t, set.Notes(), 1)
			assert.Contains(t, set.Notes()[0], c.note)
		})
	}
}

// TestNotedOnceEach: two series that differ are two notes.
func TestNotedOnceEach(t *testing.T) {
	first := clean(t, "a.csv", header+rows("NORTH", grid.Average, step(0, 1, 1))+rows("NORTH", grid.Marginal, step(0, 1, 2)))
	second := clean(t, "b.csv", header+rows("NORTH", grid.Average, step(0, 1, 3))+rows("NORTH", grid.Marginal, step(0, 1, 4)))
	notes := grid.NewSet(grid.Direct, first, second, first).Notes()
	require.Len(t, notes, 2)
	assert.Contains(t, notes[0], "(average)")
	assert.Contains(t, notes[1], "(marginal)")
}

// TestSameInstants: rows that write one moment in two zones are the same row.
func TestSameInstants(t *testing.T) {
	utc := clean(t, "a.csv", header+"NORTH,2031-03-01T23:30:00Z,2031-03-02T00:30:00Z,412,average\n")
	local := clean(t, "b.csv", header+"NORTH,2031-03-02T05:00:00+05:30,2031-03-01T19:30:00-05:00,412,average\n")
	set := grid.NewSet(grid.Direct, utc, local)
	assert.Equal(t, []grid.Interval{step(23.5, 24.5, 412)}, set.Series("NORTH", grid.Average).Steps())
	assert.Empty(t, set.Notes())
}

// TestBlankLeavesEarlier: a blank hour in a later file is no value, so that it
// does not take away the one there is.
func TestBlankLeavesEarlier(t *testing.T) {
	first := clean(t, "a.csv", header+rows("NORTH", grid.Average, step(0, 1, 412)))
	blank := clean(t, "b.csv", header+"NORTH,2031-03-01T00:00:00Z,2031-03-01T01:00:00Z,,average\n")
	assert.Equal(t, []grid.Interval{step(0, 1, 412)}, stepsOf("NORTH", grid.Average, first, blank))
}

// TestBrokenByAnyFile: one bad file among good ones is enough.
func TestBrokenByAnyFile(t *testing.T) {
	good := clean(t, "a.csv", header+rows("NORTH", grid.Average, step(0, 1, 1)))
	bad := read(t, "b.csv", header+"NORTH,2031-03-01T01:00:00Z,2031-03-01T02:00:00Z,-5,average\n")
	for _, files := range [][]*grid.File{{good, bad}, {bad, good}} {
		broken := grid.NewSet(grid.Direct, files...).Broken("NORTH")
		require.NotNil(t, broken)
		assert.Equal(t, "b.csv", broken.File)
	}
	assert.Nil(t, grid.NewSet(grid.Direct, good, good).Broken("NORTH"))
}
