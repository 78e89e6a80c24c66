package compare_test

import (
	"math"
	"slices"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/compare"
	"budgetcheck/budget/unit"
)

// noisy draws runs of one job: they scatter by up to 20 % on any grid.
func noisy(t *rapid.T, name string, least, most int, embodied float64) []compare.Sample {
	return rapid.SliceOfN(rapid.Custom(func(t *rapid.T) compare.Sample {
		return sample(10*math.Exp(rapid.Float64Range(-0.2, 0.2).Draw(t, "noise")), rapid.Float64Range(1, 2).Draw(t, "PUE"),
			rapid.Float64Range(100, 500).Draw(t, "intensity"), embodied)
	}), least, most).Draw(t, name)
}

func asked(t *rapid.T) compare.Question {
	return compare.Question{Confidence: unit.Share(rapid.Float64Range(0.6, 0.95).Draw(t, "confidence")),
		MaxRise: unit.Share(rapid.Float64Range(0, 0.3).Draw(t, "max rise")), Shares: rapid.IntRange(0, 6).Draw(t, "shares"),
		Shared: rapid.Float64Range(0, 0.05).Draw(t, "shared inputs")}
}

// width is the interval's on the scale of logarithms, told by its upper half:
// a wide one's lower end is too close to -1 to tell much.
func width(r compare.Result) float64 { return 2 * (math.Log1p(*r.High) - math.Log1p(*r.Ratio)) }

// K: multiplying one run's intensities by any c leaves the interval's width
// unchanged, where nothing is embodied; and the estimate with it.
func TestWeatherLeavesTheInterval(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		base, head, q := noisy(t, "base", 3, 11, 0), noisy(t, "head", 1, 5, 0), asked(t)
		was := compare.Compare(base, head, q)
		both := slices.Concat(base, head)
		n := rapid.IntRange(0, len(both)-1).Draw(t, "run")
		both[n].Operational *= unit.Mass(rapid.Float64Range(1e-3, 1e3).Draw(t, "c"))
		is := compare.Compare(both[:len(base)], both[len(base):], q)
		same(t, width(was), width(is))
		assert.InDelta(t, *was.Ratio, *is.Ratio, 1e-9)
		assert.Equal(t, was.State, is.State)
	})
}

// As charged, the weather counts.
func TestActualGridFollowsTheWeather(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		base, head, q := noisy(t, "base", 3, 11, 0), noisy(t, "head", 1, 5, 0), asked(t)
		q.Grid = compare.ActualGrid
		was := compare.Compare(base, head, q)
		c := rapid.Float64Range(1e-3, 1e3).Draw(t, "c")
		is := compare.Compare(base, scaled(head, func(s *compare.Sample) { s.Operational *= unit.Mass(c) }), q)
		same(t, c*(*was.Ratio+1), *is.Ratio+1)
		same(t, width(was), width(is))
	})
}

// State and figures say the same.
func TestStateFollowsTheFigures(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		q := asked(t)
		r := compare.Compare(noisy(t, "base", 3, 11, 100), noisy(t, "head", 1, 5, 100), q)
		limit := float64(q.MaxRise)
		require.True(t, *r.Low < *r.Ratio && *r.Ratio < *r.High)
		for _, bound := range []float64{*r.Low, *r.Ratio, *r.High} {
			if math.Abs(bound-limit) < 1e-11*(1+limit) {
				return // at the limit but for rounding, which counts as at it
			}
		}
		want := compare.Over
		switch {
		case *r.High <= limit:
			want = compare.Within
		case *r.Ratio <= limit:
			want = compare.Near
		case *r.Low <= limit:
			want = compare.Unproven
		}
		assert.Equal(t, want, r.State)
		assert.InEpsilon(t, math.Log1p(limit)+width(r), math.Log1p(*r.Detectable), 1e-9)
	})
}

// Changing sides turns the interval around, where both have enough runs to show
// their own noise.
func TestSwappingSides(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a, b := noisy(t, "a", 4, 4, 0), noisy(t, "b", 4, 4, 0)
		q := compare.Question{Measure: compare.EnergyOnly, Confidence: 0.95}
		there, back := compare.Compare(a, b, q), compare.Compare(b, a, q)
		if there.Drift || back.Drift || quiet(a) || quiet(b) {
			t.Skip("the base is given noise, or a line")
		}
		low, high := bounds(there)
		backLow, backHigh := bounds(back)
		assert.InDelta(t, low, -backHigh, 1e-9)
		assert.InDelta(t, high, -backLow, 1e-9)
	})
}

// quiet tells whether runs differ by hardly more than their least noise.
func quiet(runs []compare.Sample) bool {
	by := func(a, b compare.Sample) int { return int(math.Copysign(1, float64(a.Machine-b.Machine))) }
	return slices.MaxFunc(runs, by).Machine < 1.02*slices.MinFunc(runs, by).Machine
}

// Head runs have no order, and energy no size: only ratios count.
func TestOrderAndSize(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		base, head, q := noisy(t, "base", 3, 11, 0), noisy(t, "head", 1, 5, 0), asked(t)
		was := compare.Compare(base, head, q)
		c := unit.Energy(rapid.Float64Range(1e-3, 1e3).Draw(t, "c"))
		larger := func(s *compare.Sample) { s.Machine, s.Facility = s.Machine*c, s.Facility*c }
		is := compare.Compare(scaled(base, larger), scaled(rapid.Permutation(head).Draw(t, "head again"), larger), q)
		assert.InDelta(t, *was.Low, *is.Low, 1e-9)
		same(t, 1+*was.High, 1+*is.High)
		assert.Equal(t, was.Outliers, is.Outliers)
	})
}

// The uncertainty of shared inputs joins in quadrature: half the width is
// t sqrt(se^2 + u^2) with the t there was.
func TestSharedInputsJoinInQuadrature(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		base, head, q := noisy(t, "base", 3, 11, 0), noisy(t, "head", 1, 5, 0), asked(t)
		u := rapid.Float64Range(1e-3, 0.1).Draw(t, "u")
		squared := func(u float64) float64 {
			q.Shared = u
			return math.Pow(width(compare.Compare(base, head, q)), 2)
		}
		none := squared(0)
		once, twice := squared(u)-none, squared(2*u)-none
		assert.Positive(t, once)
		assert.InEpsilon(t, 4*once, twice, 1e-6)
	})
}

// A projected pilot widens the interval like an input does, by as much as the
// figure depends on its energy and by its part in the mean: a quarter of its
// figure, in a head of as many runs.
func TestPilotsJoinInQuadrature(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		base, head := noisy(t, "base", 3, 11, 0), slices.Repeat(noisy(t, "head", 1, 1, 0), rapid.IntRange(1, 5).Draw(t, "runs"))
		q, u := asked(t), rapid.Float64Range(1e-3, 0.1).Draw(t, "u")
		q.Grid, q.Shared = compare.ActualGrid, 0
		head[0].Embodied, head[0].Operational = 3*head[0].Operational/4, head[0].Operational/4
		pilot := slices.Clone(head)
		pilot[0].Variance = u * u
		is := compare.Compare(base, pilot, q)

		q.Shared = u / 4 / float64(len(head))
		like := compare.Compare(base, head, q)
		same(t, width(like), width(is))
		assert.InDelta(t, *like.Ratio, *is.Ratio, 1e-9)

		q.Measure, q.Shared = compare.EnergyOnly, u/float64(len(head))
		like = compare.Compare(base, head, q)
		q.Shared = 0
		same(t, width(like), width(compare.Compare(base, pilot, q)))
	})
}
