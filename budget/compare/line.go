package compare

import (
	"math"

	"gonum.org/v1/gonum/stat"
	"gonum.org/v1/gonum/stat/distuv"

	"budgetcheck/budget/unit"
)

// line is a straight line through points by least squares (Draper & Smith,
// Applied Regression Analysis, chapter 1, from memory).
type line struct {
	intercept, slope float64
	center, spread   float64 // mean of the places, sum of their squared distances from it
	n, sd            float64 // number of points, residual standard deviation
}

// leastSquares fits y on x, which are at least 3 points at more than one place.
func leastSquares(x, y []float64) line {
	l := line{n: float64(len(x)), center: stat.Mean(x, nil)}
	l.intercept, l.slope = stat.LinearRegression(x, y, nil, false)
	var spread, residual unit.Sum[float64]
	for k := range x {
		spread.Add(square(x[k] - l.center))
		residual.Add(square(y[k] - l.at(x[k])))
	}
	l.spread = spread.Value()
	l.sd = math.Sqrt(residual.Value() / l.df())
	return l
}

func (l line) df() float64 { return l.n - 2 }

// at is the height of the line at x.
func (l line) at(x float64) float64 { return l.intercept + l.slope*x }

// variance is that of the height at x, for points of standard deviation sd.
func (l line) variance(x, sd float64) float64 {
	return sd * sd * (1/l.n + square(x-l.center)/l.spread)
}

// sloped tells whether the slope differs from 0 at the given confidence, on
// both sides, for points of standard deviation sd.
func (l line) sloped(sd, confidence float64) bool {
	t := math.Abs(l.slope) * math.Sqrt(l.spread) / sd
	return studentOf(l.df()).CDF(t) > (1+confidence)/2
}

// student is the quantile of Student's t distribution.
func student(p, df float64) float64 { return studentOf(df).Quantile(p) }

func studentOf(df float64) distuv.StudentsT { return distuv.StudentsT{Mu: 0, Sigma: 1, Nu: df} }

func square(v float64) float64 { return v * v }
