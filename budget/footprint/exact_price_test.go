package footprint_test

import (
	"math/big"
	"slices"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

func orZero(r *big.Rat) *big.Rat {
	if r == nil {
		return new(big.Rat)
	}
	return r
}

// priceExactly is the order of sources, by looking at every step.
func priceExactly(at unit.Instant, s *footprint.Site) (*big.Rat, grid.Source) {
	if s.Series == nil {
		return annual(s), grid.FromAnnual
	}
	if i := lookUp(s.Series, at); i != nil {
		return i, grid.FromSeries
	}
	if _, end := s.Series.Span(); at < end {
		return annual(s), grid.FromHole
	}
	total, n := new(big.Rat), int64(0)
	for k := unit.Duration(1); k <= 28; k++ {
		if i := lookUp(s.Series, at.Add(-k*unit.Day)); i != nil {
			total, n = plus(total, i), n+1
		}
	}
	if n < 7 {
		return annual(s), grid.FromHole
	}
	return over(total, big.NewRat(n, 1)), grid.FromExpected
}

func annual(s *footprint.Site) *big.Rat {
	if s.Annual == nil {
		return nil
	}
	return rat(float64(*s.Annual))
}

func lookUp(s *grid.Series, at unit.Instant) *big.Rat {
	for _, step := range s.Steps() {
		if step.From <= at && at < step.To {
			return rat(float64(step.I))
		}
	}
	return nil
}

// cutsOf are the moments at which the price or the UTC hour may change, from
// open to close, in ns from open.
func cutsOf(s *grid.Series, end int64) []int64 {
	cuts := []int64{0, end}
	for at := int64(0); at < end; at += int64(unit.Hour) {
		cuts = append(cuts, at)
	}
	if s != nil {
		for _, step := range s.Steps() {
			for k := range unit.Duration(29) {
				for _, edge := range []unit.Instant{step.From, step.To} {
					if at := int64(edge.Add(k * unit.Day).Sub(start)); at > 0 && at < end {
						cuts = append(cuts, at)
					}
				}
			}
		}
	}
	slices.Sort(cuts)
	return slices.Compact(cuts)
}
