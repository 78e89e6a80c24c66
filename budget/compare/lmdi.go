package compare

import (
	"math"
	"slices"
)

// lmdiRow splits the change of a product by factor, without remainder: what
// factor k adds is term k, in the unit of the product; all terms together are
// the change, to rounding, and swapping the sides flips their signs. Factors are
// finite and not negative.
//
// It is the additive LMDI-I (Ang 2005, Energy Policy 33:867): L ln(head/base),
// with L the logarithmic mean of the two products. Zeros count with their
// analytical limits (Ang, Zhang & Choi 1998, Energy 23:489).
func lmdiRow(base, head []float64) []float64 {
	terms := make([]float64, len(base))
	from, to := lmdiProduct(base), lmdiProduct(head)
	switch {
	case from == 0 && to == 0: // nothing has changed
	case from == 0:
		lmdiLimit(terms, base, to)
	case to == 0:
		lmdiLimit(terms, head, -from)
	default:
		mean := lmdiMean(from, to)
		for k := range terms {
			terms[k] = mean * lmdiLog(base[k], head[k])
		}
	}
	return terms
}

func lmdiProduct(factors []float64) float64 {
	product := 1.0
	for _, x := range factors {
		product *= x
	}
	return product
}

// lmdiLimit gives the whole change of a row whose product is zero on one side
// to the factors that are zero there. Several of them share it equally: the
// limit of one small number in all their places. Each of them taken alone
// would get all of it, and the row would count twice. The least of the factors
// is zero, unless only their product was too small to be a number.
func lmdiLimit(terms, factors []float64, change float64) {
	least, among := slices.Min(factors), 0
	for _, x := range factors {
		if x == least {
			among++
		}
	}
	for k, x := range factors {
		if x == least {
			terms[k] = change / float64(among)
		}
	}
}

// lmdiMean is the logarithmic mean of two numbers above zero.
func lmdiMean(a, b float64) float64 {
	if a == b {
		return a
	}
	return (b - a) / lmdiLog(a, b)
}

// lmdiLog is ln(to/from). Between neighbours the quotient has lost the digits
// that the mean divides by, so it is taken of the difference.
func lmdiLog(from, to float64) float64 {
	if to < from {
		return -lmdiLog(to, from) // the same number both ways
	}
	quotient := to / from
	switch {
	case quotient < 2:
		return math.Log1p((to - from) / from)
	case math.IsInf(quotient, 0):
		return math.Log(to) - math.Log(from)
	}
	return math.Log(quotient)
}
