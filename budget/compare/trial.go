package compare

import (
	"math"

	"gonum.org/v1/gonum/stat"
	"gonum.org/v1/gonum/stat/distuv"

	"budgetcheck/budget/unit"
)

// mostRuns is how many head runs are proposed at most. The error is divided by
// their number, so that from some number on more runs settle nothing.
const mostRuns = 100

// trial is a comparison with as many head runs as one likes, all like those
// that are there.
type trial struct {
	question   Question
	base       level
	mean, sd   float64 // of the head's runs
	basePilots float64 // variance of the base's mean from projecting its pilots
	headPilots float64 // the same of the sum of the head's runs
}

func trialOf(b, h side, q Question) trial {
	base := levelOf(b.x)
	return trial{question: q, base: base, mean: stat.Mean(h.x, nil), sd: noiseOf(h.x, base),
		basePilots: b.variance / square(float64(len(b.x))), headPilots: h.variance}
}

// with is the estimate from m head runs, and the confidence of its bounds.
func (t trial) with(m int) (e estimate, confidence float64) {
	pilots := t.basePilots + t.headPilots/square(float64(m))
	return estimated(t.base, t.mean, t.sd, m).joined(pilots + square(t.question.Shared)), t.question.confidence(m)
}

// confidence of one comparison with m head runs. The error is shared by all
// comparisons and by all the times that one could look (Bonferroni): whoever
// runs again until the verdict suits has looked m times.
func (q Question) confidence(m int) float64 {
	return 1 - (1-float64(q.Confidence))/float64(max(1, q.Shares)*m)
}

// runsNeeded is the least number of head runs, more than the m there are, with
// which the state would be settled if the estimate stays; 0 where none is.
func (t trial) runsNeeded(m int, limit float64) int {
	above := math.Abs(t.mean - t.base.mean - limit)
	for n := m + 1; n <= mostRuns && above >= t.floor(n); n++ {
		if e, confidence := t.with(n); e.tells(above, confidence) {
			return n
		}
	}
	return 0
}

// floor is what half the interval is wide at least with m head runs or more:
// they leave the doubt about the base, the error is divided further, and no t
// quantile is below the normal one.
func (t trial) floor(m int) float64 {
	remaining := t.base.variance + t.basePilots + square(t.question.Shared)
	return distuv.UnitNormal.Quantile(t.question.confidence(m))*math.Sqrt(remaining) - rounding
}

// Rule is a limit on a rise as the policy writes it.
type Rule struct {
	MaxRise    unit.Share // from 0
	Confidence unit.Share // above 0.5 and below 1
	BaseRuns   int
}

// Detectable is the least true rise (head/base - 1) that one head run shows to
// be over the limit with probability Confidence, where the logarithms of runs
// have the standard deviation noise. ok is false below 3 base runs.
func (r Rule) Detectable(noise unit.Share) (rise float64, ok bool) {
	half, ok := r.halfWidth(noise)
	return math.Expm1(math.Log1p(float64(r.MaxRise)) + 2*half), ok
}

// Resolution is the rise (head/base - 1) that one head run just tells from
// none. Where MaxRise is smaller, even a change that measures exactly like its
// base is near at best. ok is false below 3 base runs.
func (r Rule) Resolution(noise unit.Share) (rise float64, ok bool) {
	half, ok := r.halfWidth(noise)
	return math.Expm1(half), ok
}

func (r Rule) halfWidth(noise unit.Share) (half float64, ok bool) {
	if r.BaseRuns < leastBase {
		return 0, false
	}
	n, sd := float64(r.BaseRuns), max(float64(noise), leastNoise)
	base := level{variance: sd * sd / n, sd: sd, df: n - 1}
	return estimated(base, 0, sd, 1).halfWidth(float64(r.Confidence)), true
}
