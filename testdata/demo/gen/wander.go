package main

import (
	"math"
	"math/rand/v2"
)

// wander is a first-order autoregressive process around 0: noise that
// remembers, as weather and a device's load do.
type wander struct {
	rng  *rand.Rand
	keep float64 // how much of a value is left in the next, 0 to 1
	kick float64 // standard deviation of what is new in each
	now  float64
}

// newWander starts in the steady state, so that the first values spread as
// wide as the last: sd is the standard deviation of each.
func newWander(rng *rand.Rand, keep, sd float64) *wander {
	return &wander{rng, keep, sd * math.Sqrt(1-keep*keep), sd * rng.NormFloat64()}
}

func (w *wander) next() float64 {
	w.now = w.keep*w.now + w.kick*w.rng.NormFloat64()
	return w.now
}
