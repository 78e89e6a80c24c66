package footprint

import (
	"math"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// bucket is a span of time with one price: a step of the series, cut at UTC
// hours. Energy is summed by bucket and priced at the end.
type bucket struct {
	from, to unit.Instant
	price    grid.Price
	measured unit.Sum[unit.Joules] // over all meters
	proven   unit.Sum[unit.Joules] // of measured, what is not estimated
	filled   unit.Sum[unit.Joules]
}

// timeline is the buckets from a part's open on, made as they are needed.
type timeline struct {
	pricer  grid.Pricer
	start   unit.Instant
	buckets []bucket
}

// at is bucket n; every bucket before it must have been asked for.
func (t *timeline) at(n int) *bucket {
	if n == len(t.buckets) {
		t.grow()
	}
	return &t.buckets[n]
}

func (t *timeline) grow() {
	from := t.start
	if n := len(t.buckets); n > 0 {
		from = t.buckets[n-1].to
	}
	price := t.pricer.At(from)
	to := min(price.Until, nextHour(from))
	if to <= from { // in the last hour of an Instant's range
		to = math.MaxInt64
	}
	t.buckets = append(t.buckets, bucket{from: from, to: to, price: price})
}

func nextHour(t unit.Instant) unit.Instant { return unit.HourStart(t.Hour() + 1) }

// overlap is how much of the bucket lies between from and to.
func (b *bucket) overlap(from, to unit.Instant) unit.Duration {
	return max(min(b.to, to).Sub(max(b.from, from)), 0)
}
