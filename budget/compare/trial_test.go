package compare

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"pgregory.net/rapid"

	"budgetcheck/budget/unit"
)

// K: noise 0.02, one head run, at 0.95 and no rise allowed. By hand: t is
// 2.919986, 2.131847, 1.833113; exp(2 t 0.02 sqrt(1/n + 1)) - 1.
func TestDetectable(t *testing.T) {
	for n, want := range map[int]float64{3: 0.1444, 5: 0.0979, 10: 0.0799} {
		rise, ok := Rule{MaxRise: 0, Confidence: 0.95, BaseRuns: n}.Detectable(0.02)
		assert.True(t, ok)
		assert.InDelta(t, want, rise, 5e-5, "%d base runs", n)

		above, _ := Rule{MaxRise: 0.05, Confidence: 0.95, BaseRuns: n}.Detectable(0.02)
		assert.InEpsilon(t, 1.05*(1+rise), 1+above, 1e-12, "over what is allowed")
		tells, ok := Rule{MaxRise: 0.05, Confidence: 0.95, BaseRuns: n}.Resolution(0.02)
		assert.True(t, ok)
		assert.InEpsilon(t, 1+rise, (1+tells)*(1+tells), 1e-12, "half as far, in logarithms")
	}
	for _, n := range []int{0, 1, 2} {
		_, ok := Rule{Confidence: 0.95, BaseRuns: n}.Detectable(0.02)
		assert.False(t, ok)
		_, ok = Rule{Confidence: 0.95, BaseRuns: n}.Resolution(0.02)
		assert.False(t, ok)
	}
}

// K: four comparisons at 0.95 are each at 0.9875; two head runs halve the rest.
func TestConfidence(t *testing.T) {
	for _, c := range []struct {
		shares, runs int
		want         float64
	}{{0, 1, 0.95}, {1, 1, 0.95}, {4, 1, 0.9875}, {1, 2, 0.975}, {1, 5, 0.99}, {4, 2, 0.99375}} {
		assert.InDelta(t, c.want, Question{Confidence: 0.95, Shares: c.shares}.confidence(c.runs), 1e-15, "%v", c)
	}
}

// A finer rule needs quieter runs or more of them.
func TestDetectableGrows(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		r := Rule{unit.Share(rapid.Float64Range(0, 0.5).Draw(t, "max rise")), unit.Share(rapid.Float64Range(0.6, 0.99).Draw(t, "confidence")),
			rapid.IntRange(3, 30).Draw(t, "base runs")}
		noise := unit.Share(rapid.Float64Range(0.006, 0.3).Draw(t, "noise"))
		least, _ := r.Detectable(noise)
		louder, _ := r.Detectable(noise * 1.01)
		more := r
		more.BaseRuns++
		finer, _ := more.Detectable(noise)
		assert.Greater(t, louder, least)
		assert.Less(t, finer, least)
		assert.Greater(t, least, float64(r.MaxRise))
		quiet, _ := r.Detectable(0)
		floor, _ := r.Detectable(leastNoise)
		assert.Equal(t, floor, quiet)
	})
}

// like are m head runs of a mean and a standard deviation.
func like(mean, sd float64, m int) []float64 {
	x := make([]float64, m)
	if m == 1 {
		return []float64{mean}
	}
	var squares float64
	for k := range x {
		x[k] = float64(k) - float64(m-1)/2
		squares += x[k] * x[k]
	}
	for k := range x {
		x[k] = mean + x[k]*sd*math.Sqrt(float64(m-1)/squares)
	}
	return x
}

func energies(x []float64) (runs []Sample) {
	for _, v := range x {
		runs = append(runs, Sample{Machine: unit.Energy(math.Exp(v))})
	}
	return runs
}

// What is proposed does it: with so many head runs of the same mean and noise
// the state is settled, with one less it is not.
func TestRunsNeededSettle(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x := drawn(t, "base", 3, 12)
		q := Question{Measure: EnergyOnly, MaxRise: unit.Share(rapid.Float64Range(0, 0.1).Draw(t, "max rise")), Confidence: 0.95,
			Shares: rapid.IntRange(1, 5).Draw(t, "shares"), Shared: rapid.Float64Range(0, 0.02).Draw(t, "shared")}
		base := levelOf(x)
		mean := base.mean + rapid.Float64Range(-0.4, 0.4).Draw(t, "rise")
		ask := func(m int) Result { return Compare(energies(x), energies(like(mean, base.sd, m)), q) }
		settled := func(r Result) bool { return r.State == Within || r.State == Over }
		if r := ask(1); r.RunsNeeded > 0 {
			assert.False(t, settled(r))
			assert.True(t, settled(ask(r.RunsNeeded)), "%d", r.RunsNeeded)
			assert.False(t, settled(ask(r.RunsNeeded-1)), "%d", r.RunsNeeded)
		}
	})
}

// Searching no further than where the doubt about the base alone is too much
// finds the same as searching to the end.
func TestRunsNeededFindsAll(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		sd := rapid.Float64Range(0.01, 0.1).Draw(t, "noise")
		n := float64(rapid.IntRange(3, 60).Draw(t, "base runs"))
		ask := trial{question: Question{Confidence: 0.95}, base: level{variance: sd * sd / n, sd: sd, df: n - 1}, sd: sd}
		e, confidence := ask.with(rapid.IntRange(2, mostRuns).Draw(t, "runs that do"))
		just := rapid.Float64Range(0.99, 1.01).Filter(func(v float64) bool { return math.Abs(v-1) > 1e-9 }).Draw(t, "or just not")
		ask.mean = e.halfWidth(confidence) * just
		all := 0
		for m := mostRuns; m > 1; m-- {
			if e, confidence := ask.with(m); ask.mean >= e.halfWidth(confidence) {
				all = m
			}
		}
		assert.Equal(t, all, ask.runsNeeded(1, 0))
	})
}

// TestRunsNeededByHand: ten base runs of noise 0.02 and one head run 3 % above
// them. With 5 runs at 0.99 and 8.1 degrees of freedom t is 2.88, and
// 2.88 sqrt(1/10 + 1/5) 0.02 = 0.0315 is more than ln 1.03 = 0.0296; with 6 at
// 0.99167 and 10.67 it is 2.85, and 2.85 sqrt(1/10 + 1/6) 0.02 = 0.0294 is not.
func TestRunsNeededByHand(t *testing.T) {
	base := level{variance: 0.0004 / 10, sd: 0.02, df: 9}
	ask := trial{question: Question{Confidence: 0.95}, base: base, sd: 0.02, mean: math.Log(1.03)}
	assert.Equal(t, 6, ask.runsNeeded(1, 0))
	assert.Equal(t, 6, ask.runsNeeded(5, 0))
	ask.mean = 0.012 // the base alone leaves 1.645 x 0.0063
	assert.Equal(t, 0, ask.runsNeeded(1, 0), "none")
}
