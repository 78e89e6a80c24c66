package forecast

import "gonum.org/v1/gonum/stat"

// persistence is the lag-1 autocorrelation r of values in order of time, at least
// 0, and 0 where there are fewer than 5. So few values show too little of it, by
// (1 + 4r)/n (Marriott & Pope 1954, Biometrika 41:390, from memory). That is
// added up to 0.8, beyond which values as few as these say nothing.
func persistence(x []float64) float64 {
	if len(x) < 5 {
		return 0
	}
	mean := stat.Mean(x, nil)
	var lagged, square float64
	for n, v := range x {
		square += (v - mean) * (v - mean)
		if n > 0 {
			lagged += (v - mean) * (x[n-1] - mean)
		}
	}
	if square == 0 {
		return 0
	}
	r := lagged / square
	return max(r, min(r+(1+4*max(r, 0))/float64(len(x)), 0.8), 0)
}

// effective is the number of independent values that say as much as n with lag-1
// autocorrelation r: n(1-r)/(1+r) (Zwiers & von Storch 1995, J. Climate 8:336),
// not below least, nor above n.
func effective(n, r, least float64) float64 {
	return min(max(n*(1-r)/(1+r), least), n)
}
