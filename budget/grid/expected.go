package grid

import (
	"math"

	"gonum.org/v1/gonum/stat"

	"budgetcheck/budget/unit"
)

// The expected intensity looks at the same hour of the last four weeks.
const (
	lookBack   = 28
	leastKnown = 7
)

// Expected is the intensity to expect at t: the mean of the series at t less
// 24 h times 1 to 28, where known, from at least 7 values. u is its relative
// standard uncertainty as a prediction of one more value, sd/mean sqrt(1+1/n).
func (s *Series) Expected(t unit.Instant) (i unit.Intensity, u unit.Share, ok bool) {
	var known [lookBack]float64
	n := 0
	for k := 1; k <= lookBack; k++ {
		if v, ok := s.At(t.Add(-unit.Duration(k) * unit.Day)); ok {
			known[n] = float64(v)
			n++
		}
	}
	if n < leastKnown {
		return 0, 0, false
	}
	mean, sd := stat.MeanStdDev(known[:n], nil)
	if mean > 0 {
		u = unit.Share(sd / mean * math.Sqrt(1+1/float64(n)))
	}
	return unit.Intensity(mean), u, true
}

// expectedUntil is the first moment after t at which Expected may change.
func (s *Series) expectedUntil(t unit.Instant) unit.Instant {
	until := endless
	for k := 1; k <= lookBack; k++ {
		back := unit.Duration(k) * unit.Day
		if next := s.next(t.Add(-back)); next < endless.Add(-back) {
			until = min(until, next.Add(back))
		}
	}
	return until
}
