package grid_test

import (
	"fmt"
	"math"
	"strings"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

const header = "zone,from,to,g_per_kwh,factor\n"

// midnight is where the series of the tests start.
var midnight = unit.At(time.Date(2031, 3, 1, 0, 0, 0, 0, time.UTC))

// hours is the moment n hours after midnight.
func hours(n float64) unit.Instant {
	return midnight.Add(unit.Duration(n * float64(unit.Hour)))
}

// step is intensity g from one hour to another.
func step(from, to, g float64) grid.Interval {
	return grid.Interval{From: hours(from), To: hours(to), I: unit.Intensity(g)}
}

// hourly is a series of NORTH with one value an hour.
func hourly(values ...float64) *grid.Series {
	var steps []grid.Interval
	for n, v := range values {
		steps = append(steps, step(float64(n), float64(n+1), v))
	}
	return north(steps...)
}

func north(steps ...grid.Interval) *grid.Series {
	return grid.NewSeries("NORTH", grid.Average, grid.Direct, steps)
}

// rows writes steps as rows of a series file, without header.
func rows(zone string, factor grid.Factor, steps ...grid.Interval) string {
	var b strings.Builder
	for _, s := range steps {
		fmt.Fprintf(&b, "%s,%s,%s,%v,%s\n", zone, s.From, s.To, float64(s.I), factor)
	}
	return b.String()
}

// test is a test, a benchmark, or a drawn case of a property.
type test interface {
	require.TestingT
	Helper()
}

// read reads a file whose text may have anything wrong with it.
func read(t test, name, text string) *grid.File {
	t.Helper()
	f, err := grid.ReadCSV(strings.NewReader(text), name, grid.Columns{})
	require.NoError(t, err)
	return f
}

// clean reads a file that must have nothing wrong with it.
func clean(t test, name, text string) *grid.File {
	t.Helper()
	f := read(t, name, text)
	require.Empty(t, f.Findings.Lines())
	return f
}

// stepsOf are the steps of one series over the files, none if there is none.
func stepsOf(zone string, factor grid.Factor, files ...*grid.File) []grid.Interval {
	if s := grid.NewSet(grid.Direct, files...).Series(zone, factor); s != nil {
		return s.Steps()
	}
	return nil
}

// inOrder checks what every series promises: steps that last, in order,
// without overlap, each with a finite intensity from 0 up.
func inOrder(t assert.TestingT, s *grid.Series) {
	var last unit.Instant
	for n, in := range s.Steps() {
		assert.Less(t, in.From, in.To, "step %d lasts", n)
		assert.True(t, n == 0 || last <= in.From, "step %d starts at %s, before the end of the one before, %s", n, in.From, last)
		assert.GreaterOrEqual(t, float64(in.I), 0.0)
		assert.LessOrEqual(t, float64(in.I), math.MaxFloat64)
		last = in.To
	}
}
