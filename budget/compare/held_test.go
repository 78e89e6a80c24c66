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

// sample is a run of so much machine energy, at a PUE and an intensity.
func sample(machine, pue, intensity, embodied float64) compare.Sample {
	return compare.Sample{Machine: unit.Energy(machine), Facility: unit.Energy(machine * pue),
		Operational: unit.Mass(machine * pue * intensity), Embodied: unit.Mass(embodied)}
}

func one(s compare.Sample) []compare.Sample { return []compare.Sample{s} }

// K: E 100 to 126.5 kWh, PUE 1.2 to 1.14, I 400 to 500, no embodied: 0.265.
func TestHold(t *testing.T) {
	h, ok := hold(one(sample(100, 1.2, 400, 0)), one(sample(126.5, 1.14, 500, 0)))
	require.True(t, ok)
	assert.InDelta(t, 0.265, h.Ratio, 1e-12)
	assert.InEpsilon(t, 48000, float64(h.Base), 1e-12)
	assert.InEpsilon(t, 60720, float64(h.Head), 1e-12)

	h, ok = hold(one(sample(100, 1.2, 400, 2000)), one(sample(126.5, 1.14, 500, 1000)))
	require.True(t, ok)
	assert.InEpsilon(t, 50000, float64(h.Base), 1e-12, "embodied emissions are as they are")
	assert.InEpsilon(t, 61720, float64(h.Head), 1e-12)
}

// Over several base runs the intensity is the energy-weighted one, sums over
// sums, and the figures of a side are geometric means.
func TestHoldSeveral(t *testing.T) {
	base := []compare.Sample{sample(10, 1.5, 100, 0), sample(30, 1.1, 300, 0)}
	perMachine := (10*1.5*100 + 30*1.1*300) / (10 + 30.)
	head := []compare.Sample{sample(20, 1, 1, 5), sample(40, 2, 900, 7), sample(5, 1, 10, 0)}
	h, ok := hold(base, head)
	require.True(t, ok)
	assert.InEpsilon(t, perMachine*math.Sqrt(10*30), float64(h.Base), 1e-12)
	want := math.Cbrt((20*perMachine + 5) * (40*perMachine + 7) * 5 * perMachine)
	assert.InEpsilon(t, want, float64(h.Head), 1e-12)
	assert.InEpsilon(t, want/(perMachine*math.Sqrt(10*30)), h.Ratio+1, 1e-12)
}

// Where no ratio can be told, none is: no side, no energy, no emissions.
func TestHoldNot(t *testing.T) {
	good := sample(10, 1.2, 100, 1)
	without := map[string]compare.Sample{
		"energy":                 sample(0, 1.2, 100, 0),
		"energy but embodied":    sample(0, 1.2, 100, 5),
		"facts at all":           {},
		"energy, all the same":   {Facility: 5, Operational: 5},
		"an energy to be told":   sample(math.NaN(), 1.2, 100, 0),
		"an end to its energy":   sample(math.Inf(1), 1.2, 100, 0),
		"an end to its embodied": {Machine: 1, Facility: 1, Operational: 1, Embodied: unit.Mass(math.Inf(1))},
	}
	for name, bad := range without {
		for _, sides := range [][2][]compare.Sample{{one(bad), one(good)}, {one(good), one(bad)}, {{good, bad}, {good}}, {{good}, {bad, good}}} {
			h, ok := hold(sides[0], sides[1])
			assert.False(t, ok, "without %s: %+v", name, h)
		}
	}
	for _, sides := range [][2][]compare.Sample{{nil, nil}, {one(good), nil}, {nil, one(good)}} {
		_, ok := hold(sides[0], sides[1])
		assert.False(t, ok)
	}
	free := sample(10, 1.2, 0, 0) // an hour without emissions
	_, ok := hold(one(free), one(good))
	assert.False(t, ok)
	h, ok := hold(one(good), one(free))
	assert.True(t, ok, "the head is held at the base's intensity")
	assert.InEpsilon(t, 1200/1201., h.Ratio+1, 1e-12)
	_, ok = hold(one(sample(10, 1.2, 0, 3)), one(sample(20, 1.2, 0, 6)))
	assert.True(t, ok, "embodied emissions alone make a ratio")
}

func samples() *rapid.Generator[[]compare.Sample] {
	positive := func(top float64) *rapid.Generator[float64] { return rapid.Float64Range(1e-3, top) }
	return rapid.SliceOfN(rapid.Custom(func(t *rapid.T) compare.Sample {
		return sample(positive(1e4).Draw(t, "machine"), rapid.Float64Range(1, 3).Draw(t, "PUE"),
			positive(1e3).Draw(t, "intensity"), rapid.Float64Range(0, 1e6).Draw(t, "embodied"))
	}), 1, 6)
}

func held(t *rapid.T, base, head []compare.Sample) heldFigures {
	h, ok := hold(base, head)
	require.True(t, ok)
	return h
}

// scaled multiplies one figure of every run.
func scaled(runs []compare.Sample, scale func(*compare.Sample)) []compare.Sample {
	runs = slices.Clone(runs)
	for n := range runs {
		scale(&runs[n])
	}
	return runs
}

func same(t *rapid.T, want, got float64) { assert.InEpsilon(t, want, got, 1e-9) }

// The weather of the head's hours and the PUE of its site are held out.
func TestHeadWeatherIsHeldOut(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		base, head := samples().Draw(t, "base"), samples().Draw(t, "head")
		n := rapid.IntRange(0, len(head)-1).Draw(t, "run")
		c, pue := rapid.Float64Range(1e-3, 1e3).Draw(t, "c"), rapid.Float64Range(1, 3).Draw(t, "PUE")
		dirty := slices.Clone(head)
		dirty[n].Operational *= unit.Mass(c * pue)
		dirty[n].Facility *= unit.Energy(pue)
		assert.Equal(t, held(t, base, head), held(t, base, dirty))
	})
}

// More machine energy on both sides for the same emissions is no change; nor
// is a grid that is dirtier on both, where nothing is embodied.
func TestScalingBothSides(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		base, head := samples().Draw(t, "base"), samples().Draw(t, "head")
		c := rapid.Float64Range(1e-3, 1e3).Draw(t, "c")
		was := held(t, base, head)
		energy := func(s *compare.Sample) { s.Machine *= unit.Energy(c) }
		same(t, was.Ratio+1, held(t, scaled(base, energy), scaled(head, energy)).Ratio+1)

		bare := func(s *compare.Sample) { s.Embodied = 0 }
		base, head = scaled(base, bare), scaled(head, bare)
		was = held(t, base, head)
		grid := func(s *compare.Sample) { s.Operational *= unit.Mass(c) }
		is := held(t, scaled(base, grid), scaled(head, grid))
		same(t, was.Ratio+1, is.Ratio+1)
		same(t, c*float64(was.Base), float64(is.Base))
	})
}

// A side's mean does not change with the order of its runs, nor when each is
// told twice.
func TestOrderAndRepetition(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		base, head := samples().Draw(t, "base"), samples().Draw(t, "head")
		was := held(t, base, head)
		is := held(t, rapid.Permutation(base).Draw(t, "base again"), slices.Concat(head, head))
		if was.Drift || is.Drift {
			return // then the order tells where the base stands by now
		}
		same(t, float64(was.Base), float64(is.Base))
		same(t, float64(was.Head), float64(is.Head))
	})
}

// heldFigures are the figures of two sides with the grid held.
type heldFigures struct {
	Base, Head unit.Mass
	Ratio      float64
	Drift      bool
}

// hold is what a comparison says of them, however few the runs are.
func hold(base, head []compare.Sample) (h heldFigures, ok bool) {
	r := compare.Compare(base, head, compare.Question{Confidence: 0.95})
	h.Drift = r.Drift
	if r.BaseHeld != nil {
		h.Base = unit.Mass(*r.BaseHeld)
	}
	if r.HeadHeld != nil {
		h.Head = unit.Mass(*r.HeadHeld)
	}
	if r.Ratio != nil {
		h.Ratio = *r.Ratio
	}
	return h, r.Ratio != nil
}
