package compare_test

import (
	"math"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/compare"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// bridgeAt is a moment, written in RFC 3339.
func bridgeAt(t require.TestingT, text string) unit.Instant {
	at, err := unit.ParseInstant(text)
	require.NoError(t, err)
	return at
}

// bridgeSeries has one value for every step of the given length.
func bridgeSeries(from unit.Instant, step unit.Duration, values ...float64) *grid.Series {
	var steps []grid.Interval
	for _, v := range values {
		steps = append(steps, grid.Interval{From: from, To: from.Add(step), I: unit.Intensity(v)})
		from = from.Add(step)
	}
	return grid.NewSeries("NORTH", grid.Average, grid.Direct, steps)
}

// bridgeRun is a run of 1 kWh.
func bridgeRun(s *grid.Series, from, to unit.Instant) []compare.BridgeRun {
	return []compare.BridgeRun{{Series: s, From: from, To: to, Facility: 1}}
}

func bridgeZoneOf(t require.TestingT, name string) *time.Location {
	loc, err := time.LoadLocation(name)
	require.NoError(t, err)
	return loc
}

// bridgeDaysAre checks the means of one side.
func bridgeDaysAre(t assert.TestingT, z, a float64, got *compare.BridgeDays, what string) {
	if assert.NotNil(t, got, what) {
		assert.InDelta(t, z, float64(got.Zone), 1e-9*math.Abs(z), "%s: zone", what)
		assert.InDelta(t, a, float64(got.Day), 1e-9*math.Abs(a), "%s: day", what)
	}
}

// TestBridgeDays: three days of 100, 200 and 600 g/kWh; a base run on the
// first, head runs on the others.
func TestBridgeDays(t *testing.T) {
	first := bridgeAt(t, "2031-03-01T00:00:00Z")
	hour := func(n unit.Duration) unit.Instant { return first.Add(n * unit.Hour) }
	north := bridgeSeries(first, unit.Day, 100, 200, 600)
	base := bridgeRun(north, hour(2), hour(5))

	b, h := compare.NewBridgeDays(base, bridgeRun(north, hour(46), hour(50)), time.UTC)
	bridgeDaysAre(t, 300, 100, b, "base")
	bridgeDaysAre(t, 300, 400, h, "over a midnight: both days, whole")

	light, heavy := bridgeRun(north, hour(25), hour(26))[0], bridgeRun(north, hour(70), hour(71))[0]
	heavy.Facility = 3
	b, h = compare.NewBridgeDays(base, []compare.BridgeRun{light, heavy}, time.UTC)
	bridgeDaysAre(t, 300, 100, b, "base")
	bridgeDaysAre(t, 300, (200+3*600)/4., h, "by energy")

	south := bridgeSeries(first, unit.Day, 10, 20, 30)
	b, h = compare.NewBridgeDays(base, []compare.BridgeRun{bridgeRun(south, hour(25), hour(26))[0], heavy}, time.UTC)
	bridgeDaysAre(t, 300, 100, b, "base")
	bridgeDaysAre(t, (20+3*300)/4., (20+3*600)/4., h, "two zones")

	b, h = compare.NewBridgeDays(bridgeRun(north, hour(70), hour(71)), bridgeRun(north, hour(30), hour(31)), time.UTC)
	bridgeDaysAre(t, 400, 600, b, "the earlier day is the head's")
	bridgeDaysAre(t, 400, 200, h, "and no other day is needed")
}

// TestBridgeDaysEnds: a run that ends at midnight has not touched the next day.
func TestBridgeDaysEnds(t *testing.T) {
	first := bridgeAt(t, "2031-03-01T00:00:00Z")
	north := bridgeSeries(first, unit.Day, 100, 200, 600)
	second, third := first.Add(unit.Day), first.Add(2*unit.Day)
	base := bridgeRun(north, first, first.Add(unit.Hour))
	for what, c := range map[string]struct {
		from, to unit.Instant
		z, a     float64
	}{
		"a whole day":        {second, third, 150, 200},
		"and a nanosecond":   {second, third + 1, 300, 400},
		"from one before":    {second - 1, third, 150, 150},
		"no time at all":     {second, second, 150, 200},
		"none, before it":    {second - 1, second - 1, 100, 100},
		"an end before from": {second, first, 150, 200},
	} {
		b, h := compare.NewBridgeDays(base, bridgeRun(north, c.from, c.to), time.UTC)
		bridgeDaysAre(t, c.z, 100, b, what)
		bridgeDaysAre(t, c.z, c.a, h, what)
	}
}

// TestBridgeLocalDays: days of 23 and 25 hours, of a zone half an hour off, and
// one without midnight. Hours of the day are 100 g/kWh, all others 900.
func TestBridgeLocalDays(t *testing.T) {
	for _, c := range []struct {
		zone, from string
		hours      int
		during     string
	}{
		{"UTC", "2031-03-30T00:00:00Z", 24, "2031-03-30T12:00:00Z"},
		{"Europe/Berlin", "2031-03-29T23:00:00Z", 23, "2031-03-30T12:00:00Z"},
		{"Europe/Berlin", "2031-10-25T22:00:00Z", 25, "2031-10-26T12:00:00Z"},
		{"Asia/Kolkata", "2031-03-29T18:30:00Z", 24, "2031-03-30T12:00:00Z"},
		// The clock goes from 23:59:59 on the 6th to 01:00 on the 7th.
		{"America/Santiago", "2031-09-07T04:00:00Z", 23, "2031-09-07T12:00:00Z"},
		{"America/Santiago", "2031-09-06T04:00:00Z", 24, "2031-09-06T12:00:00Z"},
	} {
		from, during := bridgeAt(t, c.from), bridgeAt(t, c.during)
		values := make([]float64, 24+c.hours+24)
		for n := range values {
			values[n] = 900
		}
		for n := range c.hours {
			values[24+n] = 100
		}
		run := bridgeRun(bridgeSeries(from.Add(-unit.Day), unit.Hour, values...), during, during.Add(unit.Hour))
		b, h := compare.NewBridgeDays(run, run, bridgeZoneOf(t, c.zone))
		bridgeDaysAre(t, 100, 100, b, c.zone+" "+c.during)
		assert.Equal(t, b, h)

		short := bridgeSeries(from, unit.Hour, values[24:24+c.hours]...)
		b, _ = compare.NewBridgeDays(bridgeRun(short, from, during), bridgeRun(short, during, during), bridgeZoneOf(t, c.zone))
		bridgeDaysAre(t, 100, 100, b, "the hours of the day are all that is needed in "+c.zone)
	}
}

// TestBridgeDaysCoverage: 95 % of 24 h are 22 h 48 min. The mean is that of the
// time known.
func TestBridgeDaysCoverage(t *testing.T) {
	first := bridgeAt(t, "2031-03-01T00:00:00Z")
	for day, what := range []string{"base's", "between", "head's"} {
		for hole, known := range map[unit.Duration]bool{72 * unit.Minute: true, 72*unit.Minute + 1: false} {
			var steps []grid.Interval
			for n := range 3 {
				from, to := first.Add(unit.Duration(n)*unit.Day), first.Add(unit.Duration(n+1)*unit.Day)
				noon := from.Add(unit.Day / 2)
				steps = append(steps, grid.Interval{From: from, To: noon, I: 100}, grid.Interval{From: noon, To: to, I: 300})
			}
			steps[2*day].From = steps[2*day].From.Add(hole)
			north := grid.NewSeries("NORTH", grid.Average, grid.Direct, steps)
			b, h := compare.NewBridgeDays(bridgeRun(north, first, first+1), bridgeRun(north, first.Add(60*unit.Hour), first.Add(61*unit.Hour)), time.UTC)
			if !known {
				assert.Nil(t, b, "%s day", what)
				assert.Nil(t, h, "%s day", what)
				continue
			}
			a := [3]float64{200, 200, 200}
			a[day] = (100*(12-1.2) + 300*12) / 22.8
			z := (100*(36-1.2) + 300*36) / (72 - 1.2)
			bridgeDaysAre(t, z, a[0], b, what)
			bridgeDaysAre(t, z, a[2], h, what)
		}
	}
}

// TestBridgeDaysAtTheEdges: a series may begin within the first day and end
// within the last, even after the run began and before it ended.
func TestBridgeDaysAtTheEdges(t *testing.T) {
	first := bridgeAt(t, "2031-03-01T00:00:00Z")
	north := bridgeSeries(first.Add(unit.Hour), 46*unit.Hour, 100)
	early, late := bridgeRun(north, first, first+1), bridgeRun(north, first.Add(48*unit.Hour)-1, first.Add(48*unit.Hour))
	b, h := compare.NewBridgeDays(early, late, time.UTC)
	bridgeDaysAre(t, 100, 100, b, "base")
	bridgeDaysAre(t, 100, 100, h, "head")
}

// TestBridgeDaysAbsent: nothing is told of a side without runs, energy or
// series, nor of days that no series knows; centuries of them are not counted.
func TestBridgeDaysAbsent(t *testing.T) {
	first := bridgeAt(t, "2031-03-01T00:00:00Z")
	north := bridgeSeries(first, unit.Day, 100, 200)
	good := bridgeRun(north, first, first.Add(unit.Hour))
	idle := bridgeRun(north, first, first.Add(unit.Hour))
	idle[0].Facility = 0
	for what, bad := range map[string][]compare.BridgeRun{
		"no run":         nil,
		"no energy":      idle,
		"no series":      bridgeRun(nil, first, first.Add(unit.Hour)),
		"before":         bridgeRun(north, first.Add(-unit.Hour), first.Add(unit.Hour)),
		"after":          bridgeRun(north, first.Add(47*unit.Hour), first.Add(49*unit.Hour)),
		"centuries":      bridgeRun(north, math.MinInt64, math.MaxInt64),
		"the first ever": bridgeRun(north, math.MinInt64, math.MinInt64),
		"the last ever":  bridgeRun(north, math.MaxInt64, math.MaxInt64),
	} {
		for _, sides := range [][2][]compare.BridgeRun{{good, bad}, {bad, good}, {bad, bad}} {
			b, h := compare.NewBridgeDays(sides[0], sides[1], time.UTC)
			assert.Nil(t, b, what)
			assert.Nil(t, h, what)
		}
	}
	b, _ := compare.NewBridgeDays(good, append(idle, good...), time.UTC)
	assert.NotNil(t, b, "an idle run among others has no weight")
}
