package ledger

import (
	"fmt"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// TestSpentTiles: whatever windows a span is cut into, they add up to the span;
// and all of it is what the entries hold.
func TestSpentTiles(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		b := &Books{}
		var held unit.Energy
		for n := range rapid.IntRange(1, 20).Draw(t, "entries") {
			start, length := rapid.Float64Range(0, 90).Draw(t, "start"), rapid.Float64Range(0.01, 9).Draw(t, "length")
			e := entry(fmt.Sprint("r", n), lasting(start, length))
			held += unit.Energy(length)
			b.Entries = append(b.Entries, e)
		}
		b.sort()
		var energy, mass, embodied float64
		for from := 0.0; from < 100; {
			to := min(100, from+rapid.Float64Range(0.1, 40).Draw(t, "window"))
			for _, l := range b.Spent(Window{From: hours(from), To: hours(to)}).Lines {
				energy, mass, embodied = energy+float64(l.Facility), mass+float64(l.Operational), embodied+float64(l.Embodied)
			}
			from = to
		}
		assert.InEpsilon(t, float64(held), energy, 1e-9)
		assert.InEpsilon(t, 400*float64(held), mass, 1e-9)
		assert.InEpsilon(t, 50*float64(held), embodied, 1e-9)
	})
}

// TestSpentByHand: an unpriced run cut by the window's start, one that lies in
// it, a run of two parts of which one is missing, and a refuted one.
func TestSpentByHand(t *testing.T) {
	refuted := func(e *Entry) { e.Reasons = []footprint.Doubt{{Reason: "negative power", Refutes: true}} }
	b := &Books{Entries: []*Entry{
		entry("cut", lasting(0, 4), unpriced), entry("sure", lasting(3, 2)), entry("refuted", lasting(4, 1), refuted),
		entry("inside", lasting(5, 1), unpriced), entry("half", lasting(6, 1), part("a", 2)), entry("later", lasting(8, 1)),
		entry("other", lasting(5, 1), charged("pull/7")), entry("nobody's", lasting(5, 1), charged("")),
	}}
	b.sort()
	s := b.Spent(Window{Repository: "harbour/tide", Account: "main", From: hours(2), To: hours(8)})
	require.Len(t, s.Lines, 1)
	l := s.Lines[0]
	assert.Equal(t, Group{"retrain-tide", "training", "quay-north", "NORTH", "quad", grid.Average, grid.Direct}, l.Group)
	assert.Equal(t, 5, l.Runs)
	assert.Equal(t, []string{"cut", "half", "inside", "refuted"}, l.InDoubt)
	assert.InDelta(t, 2+2+1+1+1, float64(l.Facility), 1e-12)
	assert.InDelta(t, 400*(2+1+1), float64(l.Operational), 1e-9) // what has a price
	assert.InDelta(t, 50*(2+2+1+1+1), float64(l.Embodied), 1e-9)
	assert.Equal(t, []string{"half", "refuted"}, l.InDoubtKWh, "a price that is missing leaves energy as certain as it was")
	assert.InDelta(t, 2+2+1+1, float64(l.SureKWh), 1e-12) // all but the refuted
	assert.InDelta(t, 450*(2+1), float64(l.SureG), 1e-9)
	assert.Zero(t, l.ProvenKWh)
	assert.InDelta(t, 450, float64(l.ProvenG), 1e-9) // inside alone
	assert.InDelta(t, float64(l.Operational+l.Embodied), float64(l.Total()), 1e-12)
	all := b.Spent(Window{From: hours(5), To: hours(6)})
	assert.InDelta(t, 3, float64(all.Lines[0].Facility), 1e-12, "each once, also one of no account")
}

// TestSpentAdded: what the store added up by itself is taken as it is.
func TestSpentAdded(t *testing.T) {
	w := Window{Account: "main", From: hours(0), To: hours(1)}
	want := Spending{Lines: []Spent{{Runs: 7}}}
	b := &Books{Entries: []*Entry{entry("r1")}, Added: map[Window]Spending{w: want}}
	assert.Equal(t, want, b.Spent(w))
	w.To++
	assert.Empty(t, b.Spent(Window{Account: "main", From: w.From, To: w.To, Known: w.To - 2}).Lines, "not booked by then")
	assert.Equal(t, 1, b.Spent(w).Lines[0].Runs)
	assert.Empty(t, b.Spent(Window{Account: "main", From: hours(7), To: hours(9)}).Lines)
	assert.Empty(t, b.Spent(Window{Account: "none", From: hours(0), To: hours(9)}).Lines)
}

// TestMerge: what several queries read together is there once.
func TestMerge(t *testing.T) {
	a := &Books{Entries: []*Entry{entry("r1"), entry("r3", lasting(2, 1))}, Marks: []*Mark{mark("v1", 1)}, Since: hours(0), Notes: []string{"torn"}}
	b := &Books{Entries: []*Entry{entry("r2", lasting(1, 1)), entry("r3", lasting(2, 1))}, Marks: []*Mark{mark("v0", 0), mark("v1", 1)}, Since: hours(1), Notes: []string{"torn"}}
	m := Merge(a, b)
	assert.Equal(t, []string{"r1", "r2", "r3"}, names(m))
	assert.Equal(t, []string{"v0", "v1"}, tags(m))
	assert.Equal(t, hours(1), m.Since, "complete for what both are complete for")
}
