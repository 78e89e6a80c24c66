package compare

import (
	"math"

	"gonum.org/v1/gonum/stat"
)

// ownNoise is how many head runs show their own noise. One shows none, and two
// hardly any: they are taken to scatter at least like the base.
const ownNoise = 3

// estimate is the logarithm of head over base, with its standard error.
type estimate struct {
	x, se float64
	df    float64 // degrees of freedom of se
}

// halfWidth is the distance from the estimate to its bound on either side, each
// held with the given confidence.
func (e estimate) halfWidth(confidence float64) float64 {
	return student(confidence, e.df) * e.se
}

// tells whether the interval leaves out what is so far from the estimate.
func (e estimate) tells(far, confidence float64) bool {
	return studentOf(e.df).CDF(far/e.se) >= confidence
}

// noiseOf is the standard deviation of the head's runs.
func noiseOf(head []float64, base level) float64 {
	switch sd := stat.StdDev(head, nil); len(head) {
	case 1:
		return base.sd
	case 2:
		return max(base.sd, sd)
	default:
		return sd
	}
}

// estimated compares the mean of m head runs, each of standard deviation sd,
// with the base. Up to two of them: the prediction of their mean from the base
// runs (Devore, Probability and Statistics, 7.3, from memory). From three on:
// two samples of unequal variance (Welch 1947, Biometrika 34:28, from memory).
func estimated(base level, mean, sd float64, m int) estimate {
	ofHead := square(sd) / float64(m)
	sum := base.variance + ofHead
	e := estimate{x: mean - base.mean, se: math.Sqrt(sum), df: base.df}
	if m >= ownNoise {
		e.df = square(sum) / (square(base.variance)/base.df + square(ofHead)/float64(m-1))
	}
	return e
}

// joined adds a variance that is no scatter of runs: inputs that both sides
// share, projected pilots. The degrees of freedom stay: with more of them the
// interval would only be narrower.
func (e estimate) joined(variance float64) estimate {
	e.se = math.Sqrt(square(e.se) + variance)
	return e
}
