package unit

import "math"

// Sum adds many terms with compensation for rounding (Neumaier 1974, ZAMM
// 54:39, from memory), so that the result does not depend on how many there
// are. The zero value is an empty sum.
type Sum[T ~float64] struct{ sum, lost T }

// Add adds one term.
func (s *Sum[T]) Add(term T) {
	total := s.sum + term
	if math.Abs(float64(s.sum)) >= math.Abs(float64(term)) {
		s.lost += (s.sum - total) + term
	} else {
		s.lost += (term - total) + s.sum
	}
	s.sum = total
}

// Value is the sum so far.
func (s *Sum[T]) Value() T { return s.sum + s.lost }
