package forecast

import (
	"math"

	"gonum.org/v1/gonum/stat/distuv"
)

// share is a part of a variance: its standard uncertainty and the degrees of
// freedom with which that is known, +Inf if exactly.
type share struct{ u, df float64 }

// combined adds independent shares in quadrature. The degrees of freedom are by
// Welch-Satterthwaite, u^4 / sum of u_i^4/df_i (JCGM 100:2008, G.4.1); +Inf
// where nothing is uncertain.
func combined(shares []share) share {
	var square, fourth float64
	for _, s := range shares {
		square += s.u * s.u
		if s.u > 0 {
			fourth += s.u * s.u * s.u * s.u / s.df
		}
	}
	c := share{math.Sqrt(square), math.Inf(1)}
	if fourth > 0 {
		c.df = square * square / fourth
	}
	return c
}

// The confidence of a landing's interval.
const confidence = 0.95

// half is the half-width of the interval: the quantile of Student's t times u.
func (s share) half() float64 {
	switch {
	case s.u == 0:
		return 0
	case math.IsInf(s.df, 1):
		return s.u * distuv.UnitNormal.Quantile((1+confidence)/2)
	}
	return s.u * distuv.StudentsT{Sigma: 1, Nu: s.df}.Quantile((1+confidence)/2)
}
