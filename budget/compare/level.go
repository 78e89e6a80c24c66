package compare

import (
	"math"

	"gonum.org/v1/gonum/stat"

	"budgetcheck/budget/unit"
)

const (
	// leastNoise is the standard deviation of ln, about 0.5 %, that runs have
	// at least: a few that happen to agree do not make the next one certain.
	leastNoise = 0.005
	leastBase  = 3 // base runs, below which noise is not known
	leastOrder = 5 // base runs, below which their autocorrelation is not known
	ofDrift    = 0.99
)

// level is where the base stands, on the scale of logarithms.
type level struct {
	mean     float64
	variance float64 // of mean
	sd       float64 // of one run
	df       float64 // degrees of freedom of sd

	drift       bool
	correlation *float64 // as used; nil where it is not
}

// levelOf finds the level of at least 3 runs in order of start: their mean or,
// where they drift, the line through them at the place of the next run. All
// head runs stand at that one place: they are runs of one commit, and running
// it again must not move what it is measured by.
func levelOf(x []float64) level {
	order := make([]float64, len(x))
	for k := range order {
		order[k] = float64(k)
	}
	l := leastSquares(order, x)
	sd := max(l.sd, leastNoise)
	if !l.sloped(sd, ofDrift) {
		return meanLevel(x)
	}
	next := float64(len(x))
	return level{mean: l.at(next), variance: l.variance(next, sd), sd: sd, df: l.df(), drift: true}
}

// meanLevel is the level of runs without drift. Runs that resemble the one
// before tell less than as many independent ones: n of them count as
// n(1-r)/(1+r), and spread wider than they show (Zwiers & von Storch 1995,
// J. Climate 8:336).
func meanLevel(x []float64) level {
	mean, variance := stat.MeanVariance(x, nil)
	n := float64(len(x))
	l := level{mean: mean}
	effective := n
	if len(x) >= leastOrder {
		r := max(0, lagOne(x, mean))
		l.correlation = &r
		effective = max(2, n*(1-r)/(1+r))
		variance *= (n - 1) / max(n-n/effective, 0.5)
	}
	l.sd = max(math.Sqrt(variance), leastNoise)
	l.variance = l.sd * l.sd / effective
	l.df = effective - 1
	return l
}

// lagOne is the autocorrelation of neighbours. Deviations below the least noise
// are given that much which hangs together with nothing: how the last digits of
// equal runs are rounded is no pattern.
func lagOne(x []float64, mean float64) float64 {
	var own, shared unit.Sum[float64]
	for k, v := range x {
		own.Add(square(v - mean))
		if k > 0 {
			shared.Add((v - mean) * (x[k-1] - mean))
		}
	}
	return shared.Value() / max(own.Value(), square(leastNoise)*float64(len(x)-1))
}
