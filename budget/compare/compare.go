package compare

import (
	"cmp"
	"fmt"
	"math"

	"gonum.org/v1/gonum/stat"

	"budgetcheck/budget/unit"
)

// State is what a comparison says of a rise.
type State string

// The states, best first.
const (
	Within   State = "within"   // proven to be within the limit
	Near     State = "near"     // within as estimated, but the interval passes the limit
	Unproven State = "unproven" // over as estimated, but the interval reaches the limit; or nothing can be told
	Over     State = "over"     // proven to be over the limit
)

// Question is what is asked of one job and stage.
type Question struct {
	Measure    Measure    // Total if empty
	Grid       Grid       // HeldGrid if empty
	MaxRise    unit.Share // from 0: by how much head may exceed base
	Confidence unit.Share // of each one-sided bound, above 0.5 and below 1
	Shares     int        // how many comparisons share the error; 1 if less
	Shared     float64    // standard uncertainty of ln(head/base) from inputs that runs share; 0 where none is declared
}

// Result is the answer. Ratios are head/base - 1. What does not apply is nil.
type Result struct {
	State  State
	Reason string // why nothing can be told; empty where Low and High are set

	// BaseHeld and HeadHeld are geometric means in g, g for one functional unit
	// or kWh. Where the base drifts, BaseHeld is where it stands by now.
	BaseHeld, HeadHeld *float64
	Ratio              *float64 // HeadHeld/BaseHeld - 1
	Low, High          *float64 // one-sided bounds, each at Confidence
	RatioU, DF         float64  // standard uncertainty of Ratio, and its degrees of freedom; 0 without Low and High

	Detectable *float64    // the least true rise that is Over with probability Confidence
	RunsNeeded int         // head runs in all that would settle it; 0 where it is settled, or where even 100 would not
	Confidence *unit.Share // after the division of the error

	BaseRuns, HeadRuns int
	Drift              bool     // base runs rise or fall with their order
	Outliers           []int    // indices of base runs far from the others; they stay in
	AutoCorrelation    *float64 // of base runs, at least 0; nil below 5 runs or with Drift
}

// Compare answers q for one job and stage. Runs are in order of their start;
// all base runs started before the first head run.
func Compare(base, head []Sample, q Question) Result {
	r := Result{State: Unproven, BaseRuns: len(base), HeadRuns: len(head)}
	b, h, reason := q.sides(base, head)
	r.Reason = cmp.Or(missing(base, head), reason)
	switch {
	case reason != "":
		return r
	case r.Reason != "":
		r.means(b.x, h.x)
	default:
		r.settle(b, h, q)
	}
	r.Outliers = outliers(b.x)
	return r
}

// missing tells which runs there are too few of; empty where there are enough.
func missing(base, head []Sample) string {
	switch {
	case len(head) == 0:
		return "there is no head run"
	case len(base) < leastBase:
		return fmt.Sprintf("%d base runs are needed to know their noise; there are %d", leastBase, len(base))
	}
	return ""
}

// means fills in what can be told without knowing the noise.
func (r *Result) means(base, head []float64) {
	if len(base) > 0 {
		r.BaseHeld = finite(math.Exp(stat.Mean(base, nil)))
	}
	if len(head) > 0 {
		r.HeadHeld = finite(math.Exp(stat.Mean(head, nil)))
	}
	if len(base) > 0 && len(head) > 0 {
		r.Ratio = ratio(stat.Mean(head, nil) - stat.Mean(base, nil))
	}
}

// settle fills in the interval and all that follows from it.
func (r *Result) settle(b, h side, q Question) {
	t := trialOf(b, h, q)
	e, confidence := t.with(len(h.x))
	half, limit := e.halfWidth(confidence), math.Log1p(float64(q.MaxRise))

	r.BaseHeld, r.HeadHeld, r.Ratio = finite(math.Exp(t.base.mean)), finite(math.Exp(t.mean)), ratio(e.x)
	r.RatioU, r.DF = e.se*math.Exp(e.x), e.df
	r.Low, r.High, r.Detectable = ratio(e.x-half), ratio(e.x+half), ratio(limit+2*half)
	r.Drift, r.AutoCorrelation = t.base.drift, t.base.correlation
	share := unit.Share(confidence)
	r.Confidence = &share
	if r.State = state(e.x-limit, half); r.State == Near || r.State == Unproven {
		r.RunsNeeded = t.runsNeeded(len(h.x), limit)
	}
}

// rounding is how far a logarithm may be off its exact value: what is exactly
// at the limit is not over it.
const rounding = 1e-12

// state judges an estimate that is so far above the limit, and half as far on
// either side as its interval is wide.
func state(above, half float64) State {
	switch {
	case above+half <= rounding:
		return Within
	case above <= rounding:
		return Near
	case above-half <= rounding:
		return Unproven
	}
	return Over
}

// ratio turns a logarithm into head/base - 1.
func ratio(x float64) *float64 { return finite(math.Expm1(x)) }

// finite is nil for a value too large to be told.
func finite(v float64) *float64 {
	if math.IsInf(v, 0) || math.IsNaN(v) {
		return nil
	}
	return &v
}
