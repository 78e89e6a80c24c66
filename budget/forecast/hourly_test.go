package forecast

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

const epoch = unit.Instant(1_930_089_600 * 1e9) // 2031-03-01T00:00:00Z, a full hour

// holed draws an hourly series that starts on a full hour near epoch; one hour
// in eight is a hole.
func holed(t *rapid.T, least, most int) *grid.Series {
	values := rapid.SliceOfN(rapid.IntRange(-50, 350), least, most).Draw(t, "values")
	start := epoch.Add(unit.Duration(rapid.IntRange(-30, 30).Draw(t, "start")) * unit.Hour)
	steps := []grid.Interval{{From: start, To: start.Add(unit.Hour), I: 100}}
	for n, v := range values {
		if v >= 0 {
			from := start.Add(unit.Duration(n+1) * unit.Hour)
			steps = append(steps, grid.Interval{From: from, To: from.Add(unit.Hour), I: unit.Intensity(v)})
		}
	}
	return grid.NewSeries("NORTH", grid.Average, grid.Direct, steps)
}

// TestExpectedAgreesWithTheSeries: up to a day ahead nothing that the series'
// own expected value looks at is missing, and the two are the same.
func TestExpectedAgreesWithTheSeries(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := holed(t, 24*8, 24*40)
		_, end := s.Span()
		h := asOf(s, end)
		hour := h.end + rapid.Int64Range(0, 23).Draw(t, "ahead")
		want, _, ok := s.Expected(unit.HourStart(hour))
		got, told := h.expected(hour, h.end)
		if ok {
			require.True(t, told)
			assert.InDelta(t, float64(want), got, 1e-9)
		}
	})
}

// expectedPlainly reads the rule from the series alone: the same hour 1 to 28
// days back, if it lies before origin; if fewer than 7 are known, the latest 7
// of the 28 days before origin.
func expectedPlainly(s *grid.Series, at, origin unit.Instant) (mean float64, ok bool) {
	if v, known := s.At(at); known && at < origin {
		return float64(v), true
	}
	var near, latest []float64
	passed := 0 // days back that lie before origin
	for k := 1; k <= 200 && passed < 28; k++ {
		back := at.Add(-unit.Duration(k) * unit.Day)
		if back >= origin {
			continue
		}
		passed++
		if v, known := s.At(back); known {
			if k <= 28 {
				near = append(near, float64(v))
			}
			if len(latest) < 7 {
				latest = append(latest, float64(v))
			}
		}
	}
	if len(near) < 7 {
		near = latest
	}
	for _, v := range near {
		mean += v / float64(len(near))
	}
	return mean, len(near) >= 7
}

// TestExpectedReadPlainly: at any lead, as of any hour, over holes.
func TestExpectedReadPlainly(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := holed(t, 24*10, 24*60)
		_, end := s.Span()
		h := asOf(s, end)
		origin := h.end - rapid.Int64Range(0, 24*20).Draw(t, "back")
		hour := origin + rapid.Int64Range(-24, 24*40).Draw(t, "ahead")
		want, ok := expectedPlainly(s, unit.HourStart(hour), unit.HourStart(origin))
		got, told := h.expected(hour, origin)
		require.Equal(t, ok, told)
		if ok {
			assert.InDelta(t, want, got, 1e-9)
		}
	})
}

// TestBacktestReadPlainly: day by day, with nothing that was not known that day.
func TestBacktestReadPlainly(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := holed(t, 24*10, 24*50)
		_, end := s.Span()
		h := asOf(s, end)
		var slots []slot
		hour := h.end
		for _, gap := range rapid.SliceOfN(rapid.Int64Range(0, 48), 1, 8).Draw(t, "gaps") {
			hour += gap + 1
			slots = append(slots, slot{hour - 1, rapid.Float64Range(0.5, 2).Draw(t, "weight")})
		}
		var squares, days float64
		for back := unit.Duration(1); back < 60; back++ {
			origin := unit.HourStart(h.end).Add(-back * unit.Day)
			if unit.HourStart(hour-1).Add(-back*unit.Day) >= unit.HourStart(h.end) {
				continue // not over yet
			}
			var foretold, came, told, all float64
			for _, s2 := range slots {
				at := unit.HourStart(s2.hour).Add(-back * unit.Day)
				i, ok := expectedPlainly(s, at, origin)
				v, known := s.At(at)
				all += s2.weight
				if ok && known {
					foretold, came, told = foretold+s2.weight*i, came+s2.weight*float64(v), told+s2.weight
				}
			}
			if told >= 0.8*all && (foretold > 0 || came == 0) {
				days++
				if foretold > 0 {
					squares += (came/foretold - 1) * (came/foretold - 1)
				}
			}
		}
		rms, ok := h.backtest(slots)
		require.Equal(t, days > 0, ok)
		if ok {
			assert.InDelta(t, math.Sqrt(squares/days), rms, 1e-9)
		}
	})
}

// TestBacktestByHand: 100 for 60 days, 200 for the last ten, and one night to
// foretell. Until the rise every past day foretold 100 and got 100. The nine
// days after its first expect (100 (28-j) + 200 j)/28, j = 1 to 9, and get 200; on the
// first, j = 0. So e^2 = sum of (200/(100 + 100 j/28) - 1)^2 / 63 tested days:
// of 70, 7 have no seven nights before them.
func TestBacktestByHand(t *testing.T) {
	values := make([]float64, 70)
	for n := range values {
		values[n] = 100
		if n >= 60 {
			values[n] = 200
		}
	}
	h := asOf(series(epoch, unit.Day, values...), epoch.Add(70*unit.Day))
	var squares float64
	for j := range 10 {
		e := 200/(100+100*float64(j)/28) - 1
		squares += e * e
	}
	rms, ok := h.backtest([]slot{{h.end + 2, 1}})
	require.True(t, ok)
	assert.InEpsilon(t, math.Sqrt(squares/63), rms, 1e-12)
}

// TestHoursOfOddSteps: an hour has the time mean of its steps; it is a hole if
// less than half of it is known.
func TestHoursOfOddSteps(t *testing.T) {
	minute := func(n int) unit.Instant { return epoch.Add(unit.Duration(n) * unit.Minute) }
	s := grid.NewSeries("NORTH", grid.Average, grid.Direct, []grid.Interval{
		{From: minute(-20), To: minute(0), I: 900}, // of an hour of which it is a third
		{From: minute(0), To: minute(45), I: 100}, {From: minute(45), To: minute(60), I: 500},
		{From: minute(60), To: minute(90), I: 300}, // half an hour is enough
		{From: minute(125), To: minute(500), I: 400},
	})
	h := asOf(s, minute(300))
	var got []float64
	for n := int64(-1); n < 6; n++ {
		got = append(got, h.at(epoch.Hour()+n))
	}
	gone := math.NaN()
	want := []float64{gone, 200, 300, 400, 400, 400, gone}
	for n := range want {
		assert.True(t, math.Abs(want[n]-got[n]) < 1e-9 || math.IsNaN(want[n]) && math.IsNaN(got[n]), "hour %d: %v, not %v", n-1, got[n], want[n])
	}
	assert.Equal(t, int64(-1), unit.Instant(-1).Hour(), "before 1970")
	assert.Equal(t, int64(-1), unit.HourStart(-1).Hour())
}

// TestNightsKnown counts the days on which the hour has a value.
func TestNightsKnown(t *testing.T) {
	h := asOf(series(epoch, unit.Hour, make([]float64, 24*9+3)...), epoch.Add(unit.Year))
	first := epoch.Hour()
	for hour, nights := range map[int64]int{0: 1, 24*8 + 5: 9, 24*9 + 2: 10, 24*9 + 3: 9, 24*30 + 2: 10, 24*30 + 3: 9, -1: 0} {
		assert.Equal(t, nights, h.nights(first+hour), "hour %d", hour)
	}
	assert.Zero(t, asOf(nil, epoch).nights(first))
}

// TestStepWithoutEnd: one step over centuries is read for ten years back only.
func TestStepWithoutEnd(t *testing.T) {
	s := grid.NewSeries("NORTH", grid.Average, grid.Direct, []grid.Interval{{From: math.MinInt64, To: math.MaxInt64, I: 400}})
	h := asOf(s, epoch)
	assert.Equal(t, int64(87_600), h.end-h.first)
	i, ok := h.expected(h.end+24*30, h.end)
	require.True(t, ok)
	assert.InEpsilon(t, 400, i, 1e-12)
}

// TestHoursOfARun: a run of 2 h 30 min from 02:15 is read in three parts.
func TestHoursOfARun(t *testing.T) {
	start := epoch.Add(2*unit.Hour + 15*unit.Minute)
	first := epoch.Hour()
	assert.Equal(t, []int64{first + 2, first + 3, first + 4}, hoursOf(start, 150*unit.Minute))
	assert.Equal(t, []int64{first + 2}, hoursOf(start, 0))
	got := slots([]firing{{start, 1}, {start.Add(unit.Hour), 0.5}}, 2*unit.Hour)
	assert.Equal(t, []slot{{first + 2, 0.5}, {first + 3, 0.75}, {first + 4, 0.25}}, got)
}
