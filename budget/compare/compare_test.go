package compare_test

import (
	"math"
	"slices"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/stat/distuv"

	"budgetcheck/budget/compare"
	"budgetcheck/budget/unit"
)

// burning are runs of so much machine energy.
func burning(kwh ...float64) (runs []compare.Sample) {
	for _, e := range kwh {
		runs = append(runs, sample(e, 1.2, 400, 0))
	}
	return runs
}

// logs are runs whose energy has these logarithms, for sources that have none.
func logs(x ...float64) []compare.Sample {
	kwh := make([]float64, len(x))
	for k, v := range x {
		kwh[k] = math.Exp(v)
	}
	return burning(kwh...)
}

// bounds are the interval's ends on the scale of logarithms.
func bounds(r compare.Result) (low, high float64) { return math.Log1p(*r.Low), math.Log1p(*r.High) }

// K, m = 1: Devore, Probability and Statistics, 7.3 (from memory): one more of
// ten, 95 % on both sides: 12.09 to 31.71.
func TestOneMoreOfTen(t *testing.T) {
	base := logs(25.2, 21.3, 22.8, 17.0, 29.8, 21.0, 25.5, 16.0, 20.9, 19.5)
	r := compare.Compare(base, logs(21.9), compare.Question{Measure: compare.EnergyOnly, Confidence: 0.975})
	low, high := bounds(r)
	assert.InDelta(t, 12.09, 21.9+low, 5e-3)
	assert.InDelta(t, 31.71, 21.9+high, 5e-3)
	assert.InEpsilon(t, math.Exp(21.9), *r.BaseHeld, 1e-9)
	assert.InDelta(t, 0, *r.Ratio, 1e-9)
	assert.False(t, r.Drift)
	assert.Zero(t, *r.AutoCorrelation, "as independent as the source takes them")
}

// K, m >= 3: R 4.2.2, t.test(extra ~ group, sleep), by Welch: -3.36548 to
// 0.20548. The base is told in an order in which its runs take turns, for they
// are independent in the source. Ten head runs divide 25 % to 2.5 %.
func TestSleep(t *testing.T) {
	first := []float64{0.7, -1.6, -0.2, -1.2, -0.1, 3.4, 3.7, 0.8, 0, 2}
	second := []float64{-0.1, 5.5, 0.1, 4.6, 0.8, 4.4, 1.1, 3.4, 1.6, 1.9}
	for _, grid := range []compare.Grid{compare.HeldGrid, compare.ActualGrid} {
		r := compare.Compare(logs(second...), logs(first...), compare.Question{Grid: grid, Confidence: 0.75})
		low, high := bounds(r)
		assert.InEpsilon(t, -3.3654832307117104, low, 1e-9)
		assert.InEpsilon(t, 0.2054832307117102, high, 1e-9)
		assert.InDelta(t, 0.975, float64(*r.Confidence), 1e-15)
		assert.Zero(t, *r.AutoCorrelation)
	}
}

// Two head runs scatter at least like the base: here the base's deviation is
// 0.01, theirs 0.02 sqrt(2), and t(0.975, 2) is 4.302653.
func TestTwoHeadRuns(t *testing.T) {
	base, question := logs(-0.01, 0.01, 0), compare.Question{Confidence: 0.95}
	_, high := bounds(compare.Compare(base, logs(0.02, -0.02), question))
	assert.InDelta(t, 4.302653*math.Sqrt(0.0001/3+0.0008/2), high, 1e-8)
	_, high = bounds(compare.Compare(base, logs(0, 0), question))
	assert.InDelta(t, 4.302653*math.Sqrt(0.0001/3+0.0001/2), high, 1e-8)
}

// Three head runs show their own noise, here 0.02 on a base's 0.01, or 0 on it:
// Welch's degrees of freedom are (1/3 + 4/3)^2/(1/18 + 16/18) = 50/17, or the
// base's 2. They divide an error of 15 % to 5 %.
func TestThreeHeadRuns(t *testing.T) {
	base, question := logs(-0.01, 0.01, 0), compare.Question{Confidence: 0.85}
	own := distuv.StudentsT{Mu: 0, Sigma: 1, Nu: 50 / 17.}.Quantile(0.95)
	_, high := bounds(compare.Compare(base, logs(0.02, -0.02, 0), question))
	assert.InDelta(t, own*math.Sqrt(0.0001/3+0.0004/3), high, 1e-8)
	_, high = bounds(compare.Compare(base, logs(0, 0, 0), question))
	assert.InDelta(t, 2.919986*math.Sqrt(0.0001/3), high, 1e-8)
}

// One comparison through all states. Three base runs of deviation 0.01, one
// head run: half the interval is 2.919986 x 0.01 sqrt(4/3) = 0.0337171.
func TestStates(t *testing.T) {
	const half, limit = 0.0337171, 0.05
	q := compare.Question{Confidence: 0.95, MaxRise: unit.Share(math.Expm1(limit))}
	for _, c := range []struct {
		at     float64
		state  compare.State
		needed bool
	}{
		{-1, compare.Within, false}, {limit - half - 1e-6, compare.Within, false}, {limit - half + 1e-6, compare.Near, true},
		{limit, compare.Near, false}, {limit + 1e-6, compare.Unproven, false}, {limit + half - 1e-6, compare.Unproven, true},
		{limit + half + 1e-6, compare.Over, false}, {1, compare.Over, false},
	} {
		r := compare.Compare(logs(-0.01, 0.01, 0), logs(c.at), q)
		assert.Equal(t, c.state, r.State, "%v", c)
		assert.Empty(t, r.Reason)
		assert.Equal(t, c.needed, r.RunsNeeded > 0, "%v", c)
		assert.InDelta(t, math.Expm1(limit+2*half), *r.Detectable, 1e-6)
	}
}

// What is exactly at the limit as people write it is not over it.
func TestExactlyAtTheLimit(t *testing.T) {
	for _, head := range []float64{105, math.Nextafter(105, 0), math.Nextafter(105, 200)} {
		for _, m := range []compare.Measure{compare.Total, compare.EnergyOnly} {
			r := compare.Compare(burning(100, 100, 100), burning(head), compare.Question{Measure: m, MaxRise: 0.05, Confidence: 0.95})
			assert.Equal(t, compare.Near, r.State)
		}
	}
	r := compare.Compare(burning(100, 100, 100), burning(105.000001), compare.Question{MaxRise: 0.05, Confidence: 0.95})
	assert.Equal(t, compare.Unproven, r.State)
}

// K: E 100 to 126.5 kWh, PUE 1.2 to 1.14, I 400 to 500: 0.265 with the grid
// held; as charged 72105/48000. A single base run shows no noise.
func TestOneRunEach(t *testing.T) {
	base, head := one(sample(100, 1.2, 400, 0)), one(sample(126.5, 1.14, 500, 0))
	r := compare.Compare(base, head, compare.Question{Confidence: 0.95})
	assert.InDelta(t, 0.265, *r.Ratio, 1e-12)
	assert.InEpsilon(t, 48000, *r.BaseHeld, 1e-12)
	assert.InEpsilon(t, 60720, *r.HeadHeld, 1e-12)
	assert.Equal(t, compare.Unproven, r.State)
	assert.Equal(t, "3 base runs are needed to know their noise; there are 1", r.Reason)
	absent(t, r)
	assert.Equal(t, []int{1, 1}, []int{r.BaseRuns, r.HeadRuns})

	r = compare.Compare(base, head, compare.Question{Grid: compare.ActualGrid, Confidence: 0.95})
	assert.InEpsilon(t, 72105/48000., *r.Ratio+1, 1e-12)
}

// absent checks that what needs an interval is not there, rather than zero.
func absent(t *testing.T, r compare.Result) {
	for _, v := range []*float64{r.Low, r.High, r.Detectable, r.AutoCorrelation} {
		assert.Nil(t, v)
	}
	assert.Nil(t, r.Confidence)
	assert.Zero(t, r.RunsNeeded)
	assert.False(t, r.Drift)
}

func working(amount float64, word string) compare.Sample {
	s := sample(10, 1.2, 400, 1)
	s.Work = unit.Work{Amount: amount, Unit: word}
	return s
}

// Where nothing can be told, the reason says so and no figure stands in.
func TestReasons(t *testing.T) {
	step := slices.Repeat(one(working(10, "step")), 3)
	rate := compare.Question{Measure: compare.PerWork, Confidence: 0.95}
	for _, c := range []struct {
		base, head []compare.Sample
		q          compare.Question
		reason     string
	}{
		{step, nil, rate, "there is no head run"},
		{step[:2], step, rate, "3 base runs are needed to know their noise; there are 2"},
		{nil, step, rate, "3 base runs are needed to know their noise; there are 0"},
		{step, one(working(10, "token")), rate, "work is counted in step and in token, of which no common rate can be told"},
		{step, one(working(0, "step")), rate, "a run has no work done, of which no rate can be told"},
		{burning(1, 1, 1), burning(1), rate, "a run has no work done, of which no rate can be told"},
		{burning(1, 1, 1), burning(0), compare.Question{Confidence: 0.95}, "a head run has no energy or no emissions, of which no ratio can be told"},
		{burning(1, 0, 1), burning(1), compare.Question{Measure: compare.EnergyOnly, Confidence: 0.95}, "a base run has no energy, of which no ratio can be told"},
	} {
		r := compare.Compare(c.base, c.head, c.q)
		assert.Equal(t, compare.Unproven, r.State)
		assert.Equal(t, c.reason, r.Reason)
		absent(t, r)
		assert.True(t, r.Ratio == nil || len(c.base) > 0 && len(c.head) > 0)
	}
	r := compare.Compare(step, slices.Repeat(one(working(20, "step")), 2), rate)
	require.Empty(t, r.Reason)
	assert.InEpsilon(t, 0.5, *r.Ratio+1, 1e-12, "the same for twice the work")
	assert.InEpsilon(t, 480.1, *r.BaseHeld, 1e-12, "g for one step")
}

// A ratio too large for a number is absent, not infinite.
func TestBeyondNumbers(t *testing.T) {
	wild := logs(-300, 300, -300, 300, -300)
	r := compare.Compare(wild, logs(0), compare.Question{Measure: compare.EnergyOnly, MaxRise: 0.05, Confidence: 0.999})
	assert.Nil(t, r.High)
	assert.Nil(t, r.Detectable)
	assert.Equal(t, -1.0, *r.Low)
	assert.Equal(t, compare.Unproven, r.State)
}
