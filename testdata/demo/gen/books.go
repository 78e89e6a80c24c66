package main

import (
	"bytes"
	"cmp"
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"budgetcheck/budget"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// The winter's nights on main that the books tell of.
var (
	firstNight = instant("2030-12-15T00:00:00Z")
	lastNight  = instant("2031-03-09T00:00:00Z")
)

// releases of the winter.
var releases = []ledger.Mark{
	{Kind: ledger.KindRelease, Tag: "v1.3", Branch: "main", Commit: mainOld, At: instant("2031-01-20T12:00:00Z")},
	{Kind: ledger.KindRelease, Tag: "v1.4", Branch: "main", Commit: mainBefore, At: instant("2031-02-24T12:00:00Z")},
}

// mainOld is where main stood before release v1.3.
const mainOld = "7d3a92f05c81e64b9037fd2a1c58e06b4f9d2e73"

// pulls are earlier pull requests, by the night of their training and how much
// more power it took.
var pulls = []struct {
	number   int
	night    string
	commit   string
	stronger float64
}{
	{171, "2031-01-14", "1f60b83c2e9d47a5f1380cb6e2d94a7710c35e8b", 0.99},
	{188, "2031-02-04", "e8250d6b17f3a94c60b2d81f5a7c3e94bd0612f7", 1.16},
	{203, "2031-02-25", "40b9c7e1d2586fa3091e7db4c8f5260ab3d19e64", 1.01},
}

// winter weighs every night and pull request by the demo's policy and enters
// them, each some minutes after its end.
func winter(policyText []byte, series []file) (file, error) {
	policy, set, err := byPolicy(policyText, series)
	if err != nil {
		return file{}, err
	}
	b := books{policy: policy, set: set}
	for day := firstNight; day <= lastNight; day = day.Add(unit.Day) {
		for _, r := range nightsOf(day) {
			b.enter(r, 0)
		}
	}
	for _, p := range pulls {
		r := trainingOf(p.night, fmt.Sprintf("retrain-tide-pull-%d", p.number), p.commit)
		r.at, r.stronger = r.at.Add(8*unit.Hour), p.stronger
		b.enter(r, p.number)
	}
	return b.file()
}

// byPolicy reads the demo's policy and the series that were just made.
func byPolicy(policyText []byte, series []file) (*budget.Policy, *grid.Set, error) {
	policy, found := budget.ParsePolicy(budget.PolicyFile{Name: "budgetcheck.toml", Data: policyText})
	if len(found) > 0 {
		return nil, nil, fmt.Errorf("%s", found[0])
	}
	var files []*grid.File
	for _, f := range series {
		read, err := grid.ReadCSV(bytes.NewReader(f.content), f.name, grid.Columns{})
		if err != nil {
			return nil, nil, err
		}
		files = append(files, read)
	}
	return policy, grid.NewSet(policy.Grid.Boundary, files...), nil
}

// books are entries as they are made.
type books struct {
	policy  *budget.Policy
	set     *grid.Set
	entries []*ledger.Entry
	err     error
}

// enter books a run of one part.
func (b *books) enter(r run, pull int) {
	if b.err != nil {
		return
	}
	records, err := r.records()
	if err != nil {
		b.err = err
		return
	}
	in, err := record.NewReader(bytes.NewReader(records[0].content), records[0].name)
	if err != nil {
		b.err = err
		return
	}
	part, err := b.policy.Weigh(in, b.set)
	if err != nil {
		b.err = err
		return
	}
	const after = 4 * unit.Minute
	e, err := b.policy.Entry(part, budget.Booking{Branch: "main", Pull: pull, Now: part.End.Add(after)})
	if err != nil {
		b.err = err
		return
	}
	b.entries = append(b.entries, e)
}

// file is the ledger, in the order in which it was written.
func (b *books) file() (f file, err error) {
	if b.err != nil {
		return file{}, b.err
	}
	slices.SortStableFunc(b.entries, func(x, y *ledger.Entry) int { return cmp.Compare(x.BookedAt, y.BookedAt) })
	dir, err := os.MkdirTemp("", "books")
	if err != nil {
		return file{}, err
	}
	defer func() { err = errors.Join(err, os.RemoveAll(dir)) }()
	path := filepath.Join(dir, "books.ndjson")
	if err := b.write(path); err != nil {
		return file{}, err
	}
	text, err := os.ReadFile(path)
	return file{"books.ndjson", text}, err
}

// write books everything, each release when it was due.
func (b *books) write(path string) (err error) {
	ctx := context.Background()
	store, err := ledger.Open(ctx, "file:"+path)
	if err != nil {
		return err
	}
	defer func() { err = errors.Join(err, store.Close()) }()
	due := slices.Clone(releases)
	for _, e := range b.entries {
		var marks []*ledger.Mark
		if len(due) > 0 && due[0].At <= e.BookedAt {
			marks, due = []*ledger.Mark{&due[0]}, due[1:]
		}
		if _, err := store.Book(ctx, []*ledger.Entry{e}, marks); err != nil {
			return err
		}
	}
	return nil
}

// nightsOf are the training and the scoring of one night. The last training
// runs are those whose records stand in base.
func nightsOf(day unit.Instant) []run {
	night := day.Time().Format("2006-01-02")
	train := trainingOf(night, "retrain-tide-"+night, commitOf(day))
	for _, r := range baseRuns() {
		if strings.HasSuffix(r.open.Run, night) {
			train = r
		}
	}
	rate := newRun(score, night)
	rate.open.Branch, rate.open.Commit = "main", commitOf(day)
	rate.at = instant(night + "T05:45:00Z").Add(unit.Duration(rate.rng.IntN(90)) * unit.Second)
	rate.longer, rate.stronger = rate.about(spread), rate.about(spread)
	rate.seats = []seat{{file: "night " + night, host: "quay-s-01", reserved: 1, meters: devices(1)}}
	return []run{train, rate}
}

// trainingOf is a training as main does it.
func trainingOf(night, name, commit string) run {
	r := newRun(retrain, night)
	r.rng = stream(name)
	r.open.Run, r.open.Branch, r.open.Commit = name, "main", commit
	r.at = instant(night + "T02:15:00Z").Add(unit.Duration(r.rng.IntN(90)) * unit.Second)
	r.longer, r.stronger = r.about(spread), r.about(spread)
	r.seats = []seat{{file: "night " + name, host: "quay-n-01", meters: devices(4)}}
	return r
}

func commitOf(day unit.Instant) string {
	switch {
	case day < releases[0].At:
		return mainOld
	case day < instant("2031-03-07T00:00:00Z"):
		return mainBefore
	}
	return mainTip
}
