package footprint_test

import (
	"encoding/json"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// kept writes a part as the ledger keeps it and reads it again.
func kept(t test, p *footprint.Part, m footprint.Method) *footprint.Booked {
	text, err := json.Marshal(p.Book(m))
	require.NoError(t, err)
	b := &footprint.Booked{}
	require.NoError(t, json.Unmarshal(text, b))
	again, err := json.Marshal(b)
	require.NoError(t, err)
	require.JSONEq(t, string(text), string(again))
	return b
}

func with(f footprint.Facts) func(*record.Open) footprint.Facts {
	return func(*record.Open) footprint.Facts { return f }
}

// TestRestoreGivesTheSameRun: what the ledger keeps of a part is all that its
// run is made of, doubts, proof and uncertainty included.
func TestRestoreGivesTheSameRun(t *testing.T) {
	m := method
	m.Uncertainty = footprint.Declared{Meter: ptr(unit.Share(0.02)), PUE: ptr(unit.Share(0.03)), Intensity: ptr(unit.Share(0.08))}
	rapid.Check(t, func(t *rapid.T) {
		d, f := drawRecord(t), facts(t, true)
		part := d.sheet(t).weigh(f, m)
		got := footprint.Combine([]*footprint.Part{kept(t, part, m).Restore(part.File, m, with(f))}, m)
		want := footprint.Combine([]*footprint.Part{part}, m)
		sameRun(t, want, got)
		for _, r := range []*footprint.Run{want, got} {
			assert.Len(t, r.Parts, 1)
		}
		assert.Equal(t, reasons(want), reasons(got))
		assert.Equal(t, want.Notes, got.Notes)
		assert.Equal(t, want.Grade, got.Grade)
		assert.Equal(t, want.Work, got.Work)
		same(t, want.Expanded, got.Expanded, "expanded")
		near(t, want.Terms.Mass.Random, got.Terms.Mass.Random, "random terms")
	})
}

// TestRestoreWithOtherFacts restates: machine = measured/share, facility =
// machine x PUE, emissions in proportion, embodied emissions anew.
func TestRestoreWithOtherFacts(t *testing.T) {
	f := plain(series(hour, 100, 500))
	f.Machine.Embodied, f.Machine.Lifetime = ptr(unit.Mass(1e6)), ptr(4*unit.Year)
	part := open(t).powers(0, 2*hour, 60, "m", 1000).close(2*hour).weigh(f, method)
	f.Site.PUE, f.Machine.MeasuredShare, f.Machine.Embodied = 1.2, 0.75, ptr(unit.Mass(2e6))
	r := footprint.Combine([]*footprint.Part{kept(t, part, method).Restore("r", method, with(f))}, method)
	assert.InEpsilon(t, 2, value(t, r.Measured), 1e-14)
	assert.InEpsilon(t, 2/0.75, value(t, r.MachineKWh), 1e-14)
	assert.InEpsilon(t, 2/0.75*1.2, value(t, r.Facility), 1e-14)
	assert.InEpsilon(t, 600/0.75*1.2, value(t, r.Operational), 1e-12)
	assert.InEpsilon(t, 2*57.077625570776256, value(t, r.Embodied), 1e-12) // twice the contract's 2 h at 1000 kg, 4 y
	assert.Empty(t, r.Doubts)
}

// TestRestoreCannotRestate another factor, boundary or zone.
func TestRestoreCannotRestate(t *testing.T) {
	f := plain(flat(400))
	b := kept(t, open(t).powers(0, hour, 60, "m", 1000).close(hour).weigh(f, method), method)
	other := method
	other.Factor = "marginal"
	assert.Contains(t, b.Restore("r", other, with(f)).Doubts[0].Reason, "was priced with the average factor")
	other = method
	other.Boundary = "lifecycle"
	assert.Contains(t, b.Restore("r", other, with(f)).Doubts[0].Reason, "was priced with the direct boundary")
	f.Site.Zone = "SOUTH"
	assert.Contains(t, b.Restore("r", method, with(f)).Doubts[0].Reason, "site quay-north is in zone SOUTH now")
}

// TestBookedWithoutFacts: a node without a policy books what it measured; the
// facts in force and the series price it when it is read.
func TestBookedWithoutFacts(t *testing.T) {
	s := open(t, opensAt(1800)).powers(1800, 3*hour, 60, "m", 1000).close(3 * hour)
	b := kept(t, s.weigh(footprint.Facts{}, method), method)
	assert.Nil(t, b.Facility)
	f := plain(series(hour/2, 100, 200, 300, 400, 500, 600))
	f.Site.PUE = 1.3
	got := footprint.Combine([]*footprint.Part{b.Restore("r", method, with(f))}, method)
	want := s.run(f, method)
	sameRun(t, want, got)
	settled, changed := b.Settle("r", method, with(f))
	require.True(t, changed)
	assert.InEpsilon(t, value(t, want.Total), value(t, settled.Total), 1e-13)
	_, changed = settled.Settle("r", method, with(f))
	assert.False(t, changed)
}

// TestSettle prices expected hours again when the series arrives, and leaves
// what the series priced before as it was, though the facts have changed.
func TestSettle(t *testing.T) {
	var week []float64
	for n := range 8 * 24 {
		week = append(week, float64(100+10*(n%24)))
	}
	at := 8*24*hour - hour
	s := open(t, opensAt(at)).powers(at, at+3*hour, 60, "m", 1000).close(at + 3*hour)
	early := plain(series(hour, week...))
	b := kept(t, s.weigh(early, method), method)
	require.InEpsilon(t, 2.0/3, float64(b.Priced.Expected), 1e-12)
	require.Positive(t, b.ExpectedUG+1) // a steady series has no spread

	late := plain(series(hour, append(week, 900, 800)...))
	late.Site.PUE = 1.5 // restated when compared, not when settled
	settled, changed := b.Settle("r", method, with(late))
	require.True(t, changed)
	assert.InEpsilon(t, 330+900+800, value(t, settled.Total), 1e-12)
	assert.InEpsilon(t, 1, float64(settled.Priced.Series), 1e-12)
	assert.InEpsilon(t, 3, value(t, settled.Facility), 1e-12)

	again, changed := b.Settle("r", method, with(early))
	assert.False(t, changed)
	assert.Equal(t, *b, again)
}

// TestWithin: hours belong to the span that they lie in; spans add up to the
// whole.
func TestWithin(t *testing.T) {
	f := plain(series(hour, 100, 500, 300))
	f.Machine.Embodied, f.Machine.Lifetime = ptr(unit.Mass(1e6)), ptr(4*unit.Year)
	b := kept(t, open(t, opensAt(1800)).powers(1800, 3*hour, 60, "m", 1000).close(3*hour).weigh(f, method), method)
	first := b.Within(after(0), after(2*hour))
	assert.InEpsilon(t, 1.5, float64(first.Facility), 1e-12)
	assert.InEpsilon(t, 50+500, float64(first.Operational), 1e-12)
	assert.InEpsilon(t, value(t, b.Embodied)*1.5/2.5, float64(first.Embodied), 1e-12)
	half := b.Within(after(2.5*hour), after(9*hour)) // a zone that is half an hour off
	assert.InEpsilon(t, 150, float64(half.Operational), 1e-12)
	assert.Zero(t, b.Within(after(3*hour), after(9*hour)).Facility)
	rapid.Check(t, func(t *rapid.T) {
		cut := after(rapid.Float64Range(0, 4*hour).Draw(t, "cut"))
		a, c := b.Within(after(0), cut), b.Within(cut, after(4*hour))
		assert.InEpsilon(t, value(t, b.Operational), float64(a.Operational+c.Operational), 1e-12)
		assert.InEpsilon(t, value(t, b.Embodied), float64(a.Embodied+c.Embodied), 1e-12)
	})
}
