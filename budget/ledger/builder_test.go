package ledger

import (
	"context"
	"fmt"
	"math"
	"time"

	"github.com/stretchr/testify/require"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// ctx is for calls that need not be broken off.
var ctx = context.Background()

// midnight is where the books of the tests begin.
var midnight = unit.At(time.Date(2031, 3, 1, 0, 0, 0, 0, time.UTC))

// hours is the moment n hours after midnight.
func hours(n float64) unit.Instant { return midnight.Add(unit.Duration(n * float64(unit.Hour))) }

// test is a test, a benchmark, or a drawn case of a property.
type test interface {
	require.TestingT
	Helper()
}

func ptr[T any](v T) *T { return &v }

// entry is an entry of one closed part: 1 kWh in the hour from midnight on, at
// 400 g, and 50 g embodied. Edits change it.
func entry(run string, edits ...func(*Entry)) *Entry {
	e := &Entry{Kind: KindRun, Repository: "harbour/tide", Account: "main", Inputs: "aa11", Facts: "ff00"}
	e.Run.Run, e.Attempt, e.Job, e.Stage, e.Zone = run, 1, "retrain-tide", "training", "NORTH"
	e.Site, e.Machine, e.Outcome, e.Grade = "quay-north", "quad", record.OK, footprint.Measured
	e.Factor, e.Boundary, e.Of, e.Closed = grid.Average, grid.Direct, 1, true
	e.Commit, e.Branch = "c0ffee", "main"
	e.Work = &record.Work{Unit: "step", Done: 1000}
	e.Parts = []footprint.RunPart{{Site: e.Site, Machine: e.Machine}}
	lasting(0, 1)(e)
	for _, edit := range edits {
		edit(e)
	}
	return e
}

// entries are entries of one-hour runs, one after the other.
func entries(name string, n int) (list []*Entry) {
	for i := range n {
		list = append(list, entry(fmt.Sprintf("%s-%d", name, i), lasting(float64(i), 1)))
	}
	return list
}

// lasting sets start and length in hours, 1 kW over it, and all that follows.
func lasting(start, length float64) func(*Entry) {
	return func(e *Entry) {
		e.Start, e.End = hours(start), hours(start+length)
		e.BookedAt = e.End.Add(unit.Minute)
		part := &e.Parts[0]
		part.Start, part.End, part.Outcome = e.Start, e.End, e.Outcome
		e.Hours = nil
		for from := start; from < start+length; from = math.Floor(from) + 1 {
			to := min(math.Floor(from)+1, start+length)
			e.Hours = append(e.Hours, footprint.Hour{From: hours(from), KWh: unit.Energy(to - from), G: ptr(unit.Mass(400 * (to - from)))})
		}
		energy(length)(e)
	}
}

// energy sets the figures that go with so many kWh in all.
func energy(kwh float64) func(*Entry) {
	return func(e *Entry) {
		g := unit.Mass(400 * kwh)
		e.Measured, e.MachineKWh, e.Facility = ptr(unit.Energy(kwh)), ptr(unit.Energy(kwh)), ptr(unit.Energy(kwh))
		e.Operational, e.Embodied, e.Total = &g, ptr(unit.Mass(50*kwh)), ptr(450*unit.Mass(kwh))
		e.ProvenKWh, e.ProvenG = unit.Energy(kwh), g
		e.Digest = fmt.Sprintf("d1-%s-%v-%v", e.Run.Run, e.Start, kwh)
		e.Parts[0].Measured, e.Parts[0].Digest = e.Measured, e.Digest
	}
}

// part makes the entry one of several parts.
func part(name string, of int) func(*Entry) {
	return func(e *Entry) { e.Parts[0].Part, e.Of = name, of }
}

// unclosed makes it the entry of a killed job.
func unclosed(e *Entry) {
	e.Closed, e.Outcome, e.Parts[0].Outcome = false, record.Failed, record.Failed
}

// unpriced takes the total away, and gives a reason.
func unpriced(e *Entry) {
	e.Operational, e.Total = nil, nil
	for n := range e.Hours {
		e.Hours[n].G = nil
	}
	e.Reasons = []footprint.Doubt{{Price: true, Reason: "no intensity"}}
}

func charged(name string) func(*Entry) { return func(e *Entry) { e.Account = name } }
func repository(name string) func(*Entry) {
	return func(e *Entry) { e.Repository = name }
}
func job(name, stage string) func(*Entry) { return func(e *Entry) { e.Job, e.Stage = name, stage } }
func inputs(hash string) func(*Entry)     { return func(e *Entry) { e.Inputs = hash } }
func commit(id string) func(*Entry)       { return func(e *Entry) { e.Commit = id } }

// correcting makes it stand in for another entry.
func correcting(o *Entry) func(*Entry) {
	return func(e *Entry) { e.Corrects, e.Why = o.ID(), "the meter was recalibrated" }
}

// mark is a release of main so many hours after midnight.
func mark(tag string, at float64) *Mark {
	return &Mark{Kind: KindRelease, Repository: "harbour/tide", Tag: tag, Commit: "c0ffee", Branch: "main", At: hours(at)}
}

// book books entries, which must not fail.
func book(t test, s Store, list ...*Entry) []Answer {
	t.Helper()
	answers, err := s.Book(ctx, list, nil)
	require.NoError(t, err)
	require.Len(t, answers, len(list))
	return answers
}

// read reads, which must not fail.
func read(t test, s Store, q Query) *Books {
	t.Helper()
	b, err := s.Read(ctx, q)
	require.NoError(t, err)
	return b
}

// names are the runs of entries, with their parts, in order.
func names(b *Books) []string {
	list := []string{}
	for _, e := range b.Entries {
		list = append(list, e.Run.Run+e.part())
	}
	return list
}

// tags are the tags of marks, in order.
func tags(b *Books) []string {
	list := []string{}
	for _, m := range b.Marks {
		list = append(list, m.Tag)
	}
	return list
}

// sound checks that nothing is wrong with a ledger.
func sound(t test, s Store) {
	t.Helper()
	findings, err := s.Vet(ctx)
	require.NoError(t, err)
	require.Empty(t, findings.Lines())
}
