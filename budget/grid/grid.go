// Package grid holds series: the carbon intensity of grid zones over time.
//
// A Series is of one zone, one factor and one boundary. Average and marginal
// factors, direct and lifecycle boundaries answer different questions and
// never meet in one sum: a Set hands out a Series only by all three.
package grid

import (
	"sort"

	"budgetcheck/budget/unit"
)

// Factor tells which emissions a kilowatt-hour is charged with: those of the
// mean of all generation, or those of the generation that follows the load.
type Factor string

// The factors.
const (
	Average  Factor = "average"
	Marginal Factor = "marginal"
)

// Boundary tells which emissions of generation are counted. Only direct ones
// are scope 2 of the GHG Protocol.
type Boundary string

// The boundaries.
const (
	Direct    Boundary = "direct"
	Lifecycle Boundary = "lifecycle"
)

// Interval is a step of a series: intensity I from From up to, not including, To.
type Interval struct {
	From, To unit.Instant
	I        unit.Intensity
}

// Series is the intensity of one zone: a step function with holes. It is safe
// for concurrent use.
type Series struct {
	Zone     string
	Factor   Factor
	Boundary Boundary

	steps []Interval // in order, without overlap, never empty
}

// NewSeries makes a series of intervals that are in order and do not overlap.
func NewSeries(zone string, factor Factor, boundary Boundary, steps []Interval) *Series {
	return &Series{Zone: zone, Factor: factor, Boundary: boundary, steps: steps}
}

// Span is the start of the first and the end of the last interval.
func (s *Series) Span() (from, to unit.Instant) {
	return s.steps[0].From, s.steps[len(s.steps)-1].To
}

// Steps are the intervals in order. The slice must not be changed.
func (s *Series) Steps() []Interval { return s.steps }

// Between are the intervals that touch the time from one moment to another. The
// slice must not be changed; a nil series has none.
func (s *Series) Between(from, to unit.Instant) []Interval {
	if s == nil {
		return nil
	}
	first := sort.Search(len(s.steps), func(n int) bool { return s.steps[n].To > from })
	last := sort.Search(len(s.steps), func(n int) bool { return s.steps[n].From >= to })
	return s.steps[first:max(first, last)]
}

// At is the intensity at t; ok is false in a hole and outside the span.
func (s *Series) At(t unit.Instant) (i unit.Intensity, ok bool) {
	n := s.after(t)
	if n == 0 || s.steps[n-1].To <= t {
		return 0, false
	}
	return s.steps[n-1].I, true
}

// after is the index of the first interval that starts after t.
func (s *Series) after(t unit.Instant) int {
	return sort.Search(len(s.steps), func(n int) bool { return s.steps[n].From > t })
}

// next is the first moment after t at which the series may change.
func (s *Series) next(t unit.Instant) unit.Instant {
	n := s.after(t)
	if n > 0 && s.steps[n-1].To > t {
		return s.steps[n-1].To
	}
	if n < len(s.steps) {
		return s.steps[n].From
	}
	return endless
}

const endless = unit.Instant(1<<63 - 1)

// overlay merges two lists of intervals, neither empty; where they overlap, top wins.
// differs is the first overlap in which they do not agree, nil if none. The
// result may share memory with under.
func overlay(under, top []Interval) (merged []Interval, differs *Interval) {
	if under[len(under)-1].To <= top[0].From { // files of days, in order
		return append(under, top...), nil
	}
	for _, u := range under {
		for len(top) > 0 && top[0].To <= u.From {
			merged, top = append(merged, top[0]), top[1:]
		}
		for len(top) > 0 && top[0].From < u.To && u.From < u.To {
			t := top[0]
			if differs == nil && t.I != u.I {
				differs = &t
			}
			if u.From < t.From {
				merged = append(merged, Interval{u.From, t.From, u.I})
			}
			if u.From = t.To; t.To <= u.To {
				merged, top = append(merged, t), top[1:]
			}
		}
		if u.From < u.To {
			merged = append(merged, u)
		}
	}
	return append(merged, top...), differs
}
