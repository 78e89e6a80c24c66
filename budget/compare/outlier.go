package compare

import (
	"math"
	"slices"
)

// Modified z-scores (Iglewicz & Hoaglin 1993, How to Detect and Handle
// Outliers; NIST/SEMATECH e-Handbook 1.3.5.17).
const (
	normalMAD  = 0.6745 // median absolute deviation of a normal distribution of sd 1
	farthest   = 3.5    // score beyond which a value is an outlier
	leastScale = normalMAD * leastNoise
)

// outliers are the indices of runs that stand far from the others. Runs that
// agree almost exactly are given the least noise, or the slightest difference
// from them would be an outlier.
func outliers(x []float64) (far []int) {
	if len(x) == 0 {
		return nil
	}
	middle := median(x)
	scale := max(median(distances(x, middle)), leastScale)
	for k, d := range distances(x, middle) {
		if normalMAD*d/scale > farthest {
			far = append(far, k)
		}
	}
	return far
}

func distances(x []float64, from float64) []float64 {
	d := make([]float64, len(x))
	for k, v := range x {
		d[k] = math.Abs(v - from)
	}
	return d
}

func median(x []float64) float64 {
	s := slices.Sorted(slices.Values(x))
	n := len(s)
	return (s[(n-1)/2] + s[n/2]) / 2
}
