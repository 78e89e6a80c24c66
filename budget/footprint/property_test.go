package footprint_test

import (
	"math"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// tight is how well figures agree that must be the same, relatively.
const tight = 1e-12

// same checks two figures, absent or not.
func same[T ~float64](t test, want, got *T, what string) {
	t.Helper()
	if want == nil {
		assert.Nil(t, got, what)
		return
	}
	near(t, float64(*want), value(t, got), what)
}

func near(t assert.TestingT, want, got float64, what string) {
	if math.Abs(got-want) > tight*math.Abs(want) {
		assert.Fail(t, what, "want %v, got %v, relatively %v apart", want, got, got/want-1)
	}
}

// sameRun checks all figures of two runs.
func sameRun(t test, want, got *footprint.Run) {
	t.Helper()
	same(t, want.Coverage, got.Coverage, "coverage")
	same(t, want.Measured, got.Measured, "measured")
	same(t, want.MachineKWh, got.MachineKWh, "machine")
	same(t, want.Facility, got.Facility, "facility")
	same(t, want.Operational, got.Operational, "operational")
	same(t, want.Embodied, got.Embodied, "embodied")
	same(t, want.Total, got.Total, "total")
	near(t, float64(want.Proven.Total), float64(got.Proven.Total), "proven total")
	near(t, float64(want.Proven.Facility), float64(got.Proven.Facility), "proven energy")
	near(t, sum(want.Hours), sum(got.Hours), "hours")
}

// facts are those of a quad at quay-north, with everything declared.
func facts(t *rapid.T, holes bool) footprint.Facts {
	f := oldMachine()
	f.Site.Series, f.Site.PUE, f.Machine.MeasuredShare = drawSeries(t, holes), 1.18, 0.75
	f.Site.Annual = ptr(unit.Intensity(412))
	return f
}

// TestSplitInTwoParts: a gapless record cut in two at any sample weighs what it
// weighed.
func TestSplitInTwoParts(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d, f := gapless(t), facts(t, false)
		cut := rapid.IntRange(0, len(d.meters[0].samples)-1).Draw(t, "cut")
		at := d.meters[0].samples[cut].at
		first, second := drawn{end: at}, drawn{end: d.end - at}
		for _, m := range d.meters {
			a, b := m, m
			a.samples, b.samples = m.samples[:cut+1], nil
			for _, s := range m.samples[cut:] {
				b.samples = append(b.samples, sample{s.at - at, s.value})
			}
			first.meters, second.meters = append(first.meters, a), append(second.meters, b)
		}
		later := func(o *record.Open) { o.At = start.Add(unit.Duration(at)) }
		whole := weighDrawn(t, d, f, method)
		split := footprint.Combine([]*footprint.Part{
			first.sheet(t, part("a", 2)).weigh(f, method), second.sheet(t, part("b", 2), later).weigh(f, method)}, method)
		require.NotNil(t, whole.Operational)
		sameRun(t, whole, split)
	})
}

// TestScaledPower: power times c is emissions times c, gaps, holes and all.
func TestScaledPower(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d, f := drawRecord(t), facts(t, true)
		f.Machine.Embodied = nil
		c := float64(rapid.IntRange(1, 1000).Draw(t, "c"))
		scaled := drawn{end: d.end}
		for _, m := range d.meters {
			m.wrap *= c
			samples := m.samples
			m.samples = nil
			for _, s := range samples {
				m.samples = append(m.samples, sample{s.at, s.value * c})
			}
			scaled.meters = append(scaled.meters, m)
		}
		want, got := weighDrawn(t, d, f, method), weighDrawn(t, scaled, f, method)
		for _, figure := range []*unit.Energy{want.Measured, want.MachineKWh, want.Facility} {
			*figure *= unit.Energy(c)
		}
		if want.Total != nil {
			*want.Operational *= unit.Mass(c)
			*want.Total *= unit.Mass(c)
		}
		want.Proven.Total *= unit.Mass(c)
		want.Proven.Facility *= unit.Energy(c)
		for n := range want.Hours {
			want.Hours[n].KWh *= unit.Energy(c)
		}
		sameRun(t, want, got)
	})
}

// TestConstantSeries: where the intensity never changes, emissions are energy
// times intensity, however the record lies.
func TestConstantSeries(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		g := 1 + eighths(t, 900, "g")
		r := weighDrawn(t, drawRecord(t), plain(series(48*hour, g)), method)
		if r.Operational == nil {
			assert.Zero(t, value(t, r.Facility))
			return
		}
		near(t, g*value(t, r.Facility), value(t, r.Operational), "operational")
		near(t, g, value(t, r.Intensity), "intensity")
	})
}

// TestPermutedMeters: whose lines come first changes nothing.
func TestPermutedMeters(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d, f := drawRecord(t), facts(t, true)
		want := weighDrawn(t, d, f, method)
		d.meters = rapid.Permutation(d.meters).Draw(t, "order")
		got := d.inTurn(t, func(left [][][]byte) int {
			var some []int
			for n, lines := range left {
				if len(lines) > 0 {
					some = append(some, n)
				}
			}
			return rapid.SampledFrom(some).Draw(t, "next")
		}).run(f, method)
		sameRun(t, want, got)
		assert.Len(t, got.Doubts, len(want.Doubts))
	})
}

// TestOffsets: the same instants written in other zones, each in its own, are
// the same record.
func TestOffsets(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s, f := drawRecord(t).sheet(t), facts(t, true)
		want := s.run(f, method)
		text := inZone(t, s.text.Bytes(), func(int) *time.Location {
			return time.FixedZone("", 60*rapid.IntRange(-14*60, 14*60).Draw(t, "offset"))
		})
		got := footprint.Combine([]*footprint.Part{weighText(t, text, f, method)}, method)
		want.Pieces, got.Pieces = nil, nil
		assert.Equal(t, want, got)
	})
}

// TestRemovedMeter: leaving a meter's lines out of a record never proves more,
// so that nobody is over for having measured less.
func TestRemovedMeter(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d, f := drawRecord(t), facts(t, true)
		whole := weighDrawn(t, d, f, method)
		n := rapid.IntRange(0, len(d.meters)-1).Draw(t, "removed")
		d.meters = append(append([]meter{}, d.meters[:n]...), d.meters[n+1:]...)
		less := weighDrawn(t, d, f, method)
		assert.LessOrEqual(t, float64(less.Proven.Facility), float64(whole.Proven.Facility)*(1+tight))
		assert.LessOrEqual(t, float64(less.Proven.Total), float64(whole.Proven.Total)*(1+tight))
	})
}
