package compare_test

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"pgregory.net/rapid"

	"budgetcheck/budget/compare"
	"budgetcheck/budget/unit"
)

// bridgeDrawSide draws a side of a job, nil among them, with zeros wherever a run may
// have them.
func bridgeDrawSide(t *rapid.T, label string) *compare.BridgeSide {
	if rapid.IntRange(0, 9).Draw(t, label+" absent") == 0 {
		return nil
	}
	some := func(what string, low, high float64) float64 {
		return rapid.OneOf(rapid.Float64Range(low, high), rapid.Just(0.0)).Draw(t, label+" "+what)
	}
	energy := unit.Energy(some("machine", 1e-6, 1e6))
	facility := energy * unit.Energy(rapid.Float64Range(1, 3).Draw(t, label+" PUE"))
	s := &compare.BridgeSide{Machine: energy, Facility: facility, Operational: unit.Intensity(some("intensity", 1e-3, 1e3)).Of(facility)}
	if word := rapid.SampledFrom([]string{"", "step", "token"}).Draw(t, label+" unit"); word != "" {
		s.Work = &unit.Work{Amount: some("work", 1e-6, 1e12), Unit: word}
	}
	if rapid.Bool().Draw(t, label+" declares embodied") {
		s.Embodied = bridgeOf(unit.Mass(some("embodied", 1e-3, 1e6)))
	}
	if rapid.Bool().Draw(t, label+" has days") {
		s.Days = &compare.BridgeDays{Zone: unit.Intensity(some("Z", 1, 1e3)), Day: unit.Intensity(some("A", 1, 1e3))}
	}
	return s
}

func bridgeDrawJobs(t *rapid.T) []compare.BridgeJob {
	return rapid.SliceOfN(rapid.Custom(func(t *rapid.T) compare.BridgeJob {
		return compare.BridgeJob{Base: bridgeDrawSide(t, "base"), Head: bridgeDrawSide(t, "head")}
	}), 0, 5).Draw(t, "jobs")
}

// bridgeCharged is what is charged for a side, g.
func bridgeCharged(s *compare.BridgeSide) (total float64) {
	if s == nil {
		return 0
	}
	if s.Embodied != nil {
		total = float64(*s.Embodied)
	}
	return total + float64(s.Operational)
}

func bridgeTotals(jobs []compare.BridgeJob) (base, head float64) {
	for _, j := range jobs {
		base, head = base+bridgeCharged(j.Base), head+bridgeCharged(j.Head)
	}
	return base, head
}

// bridgeFigures are a bridge's figures, NaN where one is absent.
func bridgeFigures(b compare.Bridge) (all []float64) {
	figures := []*unit.Mass{b.Work, b.Efficiency, b.Energy, b.Site, b.Grid, b.Embodied}
	if b.Parts != nil {
		figures = append(figures, &b.Parts.Zone, &b.Parts.Day, &b.Parts.Hour)
	}
	for _, f := range figures {
		if f == nil {
			all = append(all, math.NaN())
			continue
		}
		all = append(all, float64(*f))
	}
	return all
}

// bridgeSame checks that two bridges have the same causes, one of them times sign.
func bridgeSame(t assert.TestingT, want, got compare.Bridge, sign, delta float64) {
	a, b := bridgeFigures(want), bridgeFigures(got)
	if !assert.Len(t, b, len(a)) {
		return
	}
	for n := range a {
		if assert.Equal(t, math.IsNaN(a[n]), math.IsNaN(b[n]), "cause %d is absent", n) && !math.IsNaN(a[n]) {
			assert.InDelta(t, sign*a[n], b[n], delta, "cause %d", n)
		}
	}
}

func TestBridgeAddsUp(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		jobs := bridgeDrawJobs(t)
		base, head := bridgeTotals(jobs)
		b := compare.NewBridge(jobs...)
		assert.InDelta(t, head-base, float64(b.Change()), 1e-12*(base+head))
		if b.Parts != nil {
			assert.InDelta(t, float64(*b.Grid), float64(b.Parts.Zone+b.Parts.Day+b.Parts.Hour), 1e-12*(base+head))
		}
		for n, c := range bridgeFigures(b) {
			assert.False(t, math.IsInf(c, 0), "cause %d", n)
		}
	})
}

func TestBridgeFlips(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		jobs := bridgeDrawJobs(t)
		base, head := bridgeTotals(jobs)
		var swapped []compare.BridgeJob
		for _, j := range jobs {
			swapped = append(swapped, compare.BridgeJob{Base: j.Head, Head: j.Base})
		}
		bridgeSame(t, compare.NewBridge(jobs...), compare.NewBridge(swapped...), -1, 1e-12*(base+head))
	})
}

// TestBridgeOrder: neither the order of jobs nor their grouping matters.
func TestBridgeOrder(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		jobs := bridgeDrawJobs(t)
		base, head := bridgeTotals(jobs)
		whole := compare.NewBridge(jobs...)
		bridgeSame(t, whole, compare.NewBridge(rapid.Permutation(jobs).Draw(t, "order")...), 1, 1e-12*(base+head))
		var sum unit.Sum[unit.Mass]
		for _, j := range jobs {
			sum.Add(compare.NewBridge(j).Change())
		}
		assert.InDelta(t, float64(sum.Value()), float64(whole.Change()), 1e-12*(base+head))
	})
}

// TestBridgeOneCause: a side against itself with one thing changed. All of the
// change is that thing's, and nothing is anybody else's.
func TestBridgeOneCause(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		f := rapid.Float64Range(0.01, 100).Draw(t, "factor")
		v := []float64{1000, 100, 1.2, 450, 420, 400}
		n := rapid.IntRange(0, len(v)-1).Draw(t, "changed")
		from := bridgeSide(v[0], v[1], v[2], v[3], v[4], v[5])
		switch n {
		case 0: // more work of the same kind takes more energy
			v[0], v[1] = v[0]*f, v[1]*f
		case 3: // in another zone, days and hours differ alike
			v[3], v[4], v[5] = v[3]*f, v[4]*f, v[5]*f
		case 4:
			v[4], v[5] = v[4]*f, v[5]*f
		default:
			v[n] *= f
		}
		to := bridgeSide(v[0], v[1], v[2], v[3], v[4], v[5])
		b := compare.NewBridge(compare.BridgeJob{Base: from, Head: to})
		for k, got := range []unit.Mass{*b.Work, *b.Efficiency, *b.Site, b.Parts.Zone, b.Parts.Day, b.Parts.Hour} {
			want := 0.0
			if k == n {
				want = float64(to.Operational - from.Operational)
			}
			assert.InDelta(t, want, float64(got), 1e-11*float64(from.Operational+to.Operational), "cause %d", k)
		}
	})
}
