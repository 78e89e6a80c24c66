package grid_test

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

const day = 24 // hours

// TestExpectedOfPeriodicSeries: for a series of period 24 h the expected
// intensity is the series, without doubt, and goes on like it.
func TestExpectedOfPeriodicSeries(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		hour := rapid.SliceOfN(rapid.Float64Range(1, 1000), day, day).Draw(t, "day")
		s := hourly(repeated(hour, 28)...)
		n := rapid.IntRange(28*day, 29*day-1).Draw(t, "hour") // all 28 values lie in the span
		got, u, ok := s.Expected(hours(float64(n)))
		require.True(t, ok)
		assert.InEpsilon(t, hour[n%day], float64(got), 1e-14)
		assert.InDelta(t, 0, float64(u), 1e-14)
	})
}

// repeated is the same day many times.
func repeated(hour []float64, days int) (values []float64) {
	for range days {
		values = append(values, hour...)
	}
	return values
}

// daily has one interval of an hour at 02:00 on each day with a value; NaN
// leaves the day out.
func daily(values ...float64) *grid.Series {
	var steps []grid.Interval
	for n, v := range values {
		if at := float64(n*day + 2); !math.IsNaN(v) {
			steps = append(steps, step(at, at+1, v))
		}
	}
	return north(steps...)
}

// TestExpectedByHand: 100 to 700 in seven steps. Their mean is 400, the sum of
// squares about it 280000, so sd = 216.0247; relative to the mean and widened
// by sqrt(1 + 1/7) that is sqrt(280000/6 / 160000 * 8/7) = sqrt(1/3).
func TestExpectedByHand(t *testing.T) {
	s := daily(100, 200, 300, 400, 500, 600, 700)
	got, u, ok := s.Expected(hours(7*day + 2.5))
	require.True(t, ok)
	assert.InEpsilon(t, 400, float64(got), 1e-14)
	assert.InEpsilon(t, 1/math.Sqrt(3), float64(u), 1e-14)
}

// TestExpectedNeedsSeven: six values are too few, wherever among the 28 days
// they lie; seven are enough.
func TestExpectedNeedsSeven(t *testing.T) {
	gone := math.NaN()
	for name, c := range map[string]struct {
		values []float64
		ok     bool
	}{
		"seven nights":             {[]float64{1, 1, 1, 1, 1, 1, 1}, true},
		"six nights":               {[]float64{1, 1, 1, 1, 1, 1}, false},
		"seven of ten":             {[]float64{1, gone, 1, 1, gone, 1, 1, gone, 1, 1}, true},
		"six of nine":              {[]float64{1, gone, 1, 1, gone, 1, 1, gone, 1}, false},
		"seven, the oldest day 28": {append([]float64{1}, append(repeated([]float64{gone}, 21), 1, 1, 1, 1, 1, 1)...), true},
		"seven, the oldest day 29": {append([]float64{1}, append(repeated([]float64{gone}, 22), 1, 1, 1, 1, 1, 1)...), false},
	} {
		t.Run(name, func(t *testing.T) {
			s := daily(c.values...)
			got, u, ok := s.Expected(hours(float64(len(c.values)*day) + 2))
			assert.Equal(t, c.ok, ok)
			if !c.ok {
				assert.Zero(t, got)
				assert.Zero(t, u)
			}
		})
	}
}

// TestExpectedLooksAtNothingElse: only the same time of day counts, of the 28
// days before; the hour itself, later ones and older ones do not.
func TestExpectedLooksAtNothingElse(t *testing.T) {
	const now = 40 * day
	values := make([]float64, 80*day)
	for n := range values {
		values[n] = 1e6
		if back := now - n; back >= day && back <= 28*day && back%day == 0 {
			values[n] = 400
		}
	}
	s := hourly(values...)
	for _, at := range []unit.Instant{hours(now), hours(now).Add(unit.Hour) - 1} {
		got, u, ok := s.Expected(at)
		require.True(t, ok)
		assert.Equal(t, unit.Intensity(400), got)
		assert.Zero(t, u)
	}
	got, _, _ := s.Expected(hours(now + 1))
	assert.Equal(t, unit.Intensity(1e6), got)
}

// TestExpectedWeighsAllDays: each of the 28 values counts the same.
func TestExpectedWeighsAllDays(t *testing.T) {
	for n := range 28 {
		values := repeated([]float64{100}, 28)
		values[n] += 280
		got, u, ok := daily(values...).Expected(hours(28*day + 2))
		require.True(t, ok)
		assert.InEpsilon(t, 110, float64(got), 1e-14)
		// One of 28 is off by 280: sum of squares 280^2 (1 - 1/28) = 27 x 2800.
		assert.InEpsilon(t, math.Sqrt(2800*29/28.0)/110, float64(u), 1e-12)
	}
}

// TestExpectedOfLittle: nearly clean grids have a relative uncertainty like any
// other.
func TestExpectedOfLittle(t *testing.T) {
	got, u, _ := daily(0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7).Expected(hours(7*day + 2))
	assert.InEpsilon(t, 0.4, float64(got), 1e-14)
	assert.InEpsilon(t, 1/math.Sqrt(3), float64(u), 1e-14)
}

// TestExpectedOfZero: a grid at zero is expected at zero, and nothing is
// divided by it.
func TestExpectedOfZero(t *testing.T) {
	got, u, ok := daily(repeated([]float64{0}, 7)...).Expected(hours(7*day + 2))
	assert.True(t, ok)
	assert.Zero(t, got)
	assert.Zero(t, u)
}
