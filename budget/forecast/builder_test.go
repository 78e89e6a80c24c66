package forecast

import (
	"time"

	"github.com/stretchr/testify/require"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// at is a moment, written in RFC 3339.
func at(t require.TestingT, text string) unit.Instant {
	i, err := unit.ParseInstant(text)
	require.NoError(t, err)
	return i
}

// zone is a time zone of the database.
func zone(t require.TestingT, name string) *time.Location {
	in, err := time.LoadLocation(name)
	require.NoError(t, err)
	return in
}

// march is March 2031, the month of the tests.
func march(t require.TestingT) Period {
	p, err := Holding("month", at(t, "2031-03-10T12:00:00Z"), time.UTC)
	require.NoError(t, err)
	return p
}

// nightly are the firings of a job at 02:15 UTC in a span.
func nightly(t require.TestingT, from, to unit.Instant) []unit.Instant {
	s, err := ParseSchedule("15 2 * * *")
	require.NoError(t, err)
	firings, err := s.Firings(from, to)
	require.NoError(t, err)
	return firings
}

// series is one value for each step of a length, from a moment on.
func series(from unit.Instant, step unit.Duration, values ...float64) *grid.Series {
	steps := make([]grid.Interval, len(values))
	for n, v := range values {
		start := from.Add(unit.Duration(n) * step)
		steps[n] = grid.Interval{From: start, To: start.Add(step), I: unit.Intensity(v)}
	}
	return grid.NewSeries("NORTH", grid.Average, grid.Direct, steps)
}

// flat is the same value for days before a moment.
func flat(value float64, days int, before unit.Instant) *grid.Series {
	values := make([]float64, days)
	for n := range values {
		values[n] = value
	}
	return series(before.Add(-unit.Duration(days)*unit.Day), unit.Day, values...)
}
