package shift

import (
	"math"
	"math/rand/v2"
	"time"

	"github.com/stretchr/testify/require"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// midnight is where the series of the tests start.
var midnight = unit.At(time.Date(2031, 3, 1, 0, 0, 0, 0, time.UTC))

func after(d unit.Duration) unit.Instant { return midnight.Add(d) }

// series is intensities one step after another; NaN is a hole.
func series(step unit.Duration, values ...float64) *grid.Series {
	var steps []grid.Interval
	for n, v := range values {
		from := after(unit.Duration(n) * step)
		if !math.IsNaN(v) {
			steps = append(steps, grid.Interval{From: from, To: from.Add(step), I: unit.Intensity(v)})
		}
	}
	return grid.NewSeries("NORTH", grid.Average, grid.Direct, steps)
}

var hole = math.NaN()

// test is a test, a benchmark, or a drawn case of a property.
type test interface {
	require.TestingT
	Helper()
}

func linear(t test, d unit.Duration, samples ...Sample) Profile {
	t.Helper()
	p, err := Linear(d, samples)
	require.NoError(t, err)
	return p
}

// flat is a profile of 1 kW.
func flat(t test, d unit.Duration) Profile {
	t.Helper()
	return linear(t, d, Sample{0, 1000})
}

func interrupted(t test, r Run, at Place, how Pausing) *Interrupted {
	t.Helper()
	i, err := InterruptedRun(r, at, how)
	require.NoError(t, err)
	return i
}

// diurnal is a realistic zone: dirtier in the evening, cleaner at noon, with
// weather that wanders over days.
func diurnal(seed uint64, mean float64, step unit.Duration, days int) *grid.Series {
	r := rand.New(rand.NewPCG(seed, 1))
	weather, perDay := 0.0, int(unit.Day/step)
	keep := math.Exp(-step.Seconds() / (40 * 3600)) // correlation time 40 h
	values := make([]float64, days*perDay)
	for n := range values {
		weather = keep*weather + math.Sqrt(1-keep*keep)*r.NormFloat64()
		hour := 2 * math.Pi * float64(n) / float64(perDay)
		day := -0.18*math.Cos(hour-2*math.Pi*13/24) + 0.05*math.Cos(2*hour-2*math.Pi*19/12)
		values[n] = mean * max(0.05, 1+day+0.2*weather)
	}
	return series(step, values...)
}

func total(t test, r Run, at Place, start unit.Instant) float64 {
	t.Helper()
	g, ok := Total(r, at, start)
	require.True(t, ok)
	return float64(g)
}
