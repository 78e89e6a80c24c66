package shift

import (
	"math"
	"slices"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// Hyndman & Fan 1996, type 7, of 1 2 3 4: the K.
func TestQuartilesOfFour(t *testing.T) {
	four := []float64{1, 2, 3, 4}
	assert.Equal(t, unit.Mass(1.75), quantile(four, 0.25))
	assert.Equal(t, unit.Mass(2.5), quantile(four, 0.5))
	assert.Equal(t, unit.Mass(3.25), quantile(four, 0.75))
	assert.Equal(t, unit.Mass(7), quantile([]float64{7}, 0.75))
	assert.Equal(t, unit.Mass(4), quantile(four, 1))
}

// days is a zone's series of one value an hour, which grows from 1 g on.
func days(from unit.Instant, hours int) *grid.Series {
	var steps []grid.Interval
	for n := range hours {
		at := from.Add(unit.Duration(n) * unit.Hour)
		steps = append(steps, grid.Interval{From: at, To: at.Add(unit.Hour), I: unit.Intensity(n + 1)})
	}
	return grid.NewSeries("NORTH", grid.Average, grid.Direct, steps)
}

// A run of an hour, a series from 20:00 over one whole day and five hours more:
// the starts are the hours of the whole day, the totals 5 to 28 g.
func TestSpreadTakesWholeDays(t *testing.T) {
	r := Run{Profile: flat(t, unit.Hour), Start: midnight}
	north := Site{Place: Place{"quay-north", days(midnight.Add(-4*unit.Hour), 33), 1}}
	south := Site{Place: Place{"quay-south", days(midnight.Add(-4*unit.Hour), 33), 2}, Moves: 10, PerGB: 3}
	spread := Spreads(r, []Site{north, south}, time.UTC)
	require.Len(t, spread, 2)
	stood := unit.Mass(5)
	assert.Equal(t, Spread{Site: "quay-north", Min: 5, Q1: 10.75, Mean: 16.5, Median: 16.5, Q3: 22.25, Max: 28, Starts: 24, Stood: &stood}, spread[0])
	assert.Equal(t, unit.Mass(40), spread[1].Min, "PUE and moving are in")
	assert.Equal(t, unit.Mass(86), spread[1].Max)
	r.Start = after(6 * unit.Hour)
	assert.Equal(t, unit.Share(0.25), Spreads(r, []Site{north}, time.UTC)[0].Below)
}

// A hole at one site takes the start from every site.
func TestSpreadHasTheSameStarts(t *testing.T) {
	r := Run{Profile: flat(t, 90*unit.Minute), Start: midnight}
	values := slices.Repeat([]float64{100}, 48)
	whole := Site{Place: Place{"whole", series(unit.Hour, values...), 1}}
	values[10] = hole
	broken := Site{Place: Place{"broken", series(unit.Hour, values...), 1}}
	for _, s := range Spreads(r, []Site{whole, broken}, time.UTC) {
		assert.Equal(t, 48-2-1, s.Starts, "9:00 and 10:00 meet the hole, the last hour the end")
	}
	assert.Nil(t, Spreads(r, []Site{whole, {Place: Place{Name: "unknown", PUE: 1}}}, time.UTC))
	assert.Nil(t, Spreads(r, nil, time.UTC))
}

func TestSpreadFollowsTheClock(t *testing.T) {
	for _, c := range []struct {
		zone   string
		y      int
		m      time.Month
		d      int
		starts int
	}{
		{"Europe/Berlin", 2031, time.March, 30, 23},
		{"Europe/Berlin", 2031, time.October, 26, 25},
		{"Asia/Kolkata", 2031, time.March, 1, 24},
		{"America/Sao_Paulo", 2018, time.November, 4, 23}, // no 0:00
		{"Australia/Lord_Howe", 2031, time.April, 6, 24},  // half an hour more
	} {
		zone, err := time.LoadLocation(c.zone)
		require.NoError(t, err)
		begin := time.Date(c.y, c.m, c.d, 1, 0, 0, 0, zone).Add(-8 * time.Hour)
		s := days(unit.At(begin.Truncate(30*time.Minute)), 40)
		r := Run{Profile: flat(t, unit.Minute), Start: midnight}
		got := Spreads(r, []Site{{Place: Place{"a", s, 1}}}, zone)
		require.Len(t, got, 1, c.zone)
		assert.Equal(t, c.starts, got[0].Starts, c.zone)
	}
}

// What Spreads reads from tables is what Total integrates, off the full second
// as well.
func TestSpreadIsOfTotals(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		off := unit.Duration(rapid.IntRange(0, 2).Draw(t, "off")) * unit.Second / 3
		s := days(midnight.Add(off-30*unit.Hour), 100)
		r := Run{Profile: wavy(t, unit.Duration(rapid.Int64Range(1, int64(3*unit.Hour)).Draw(t, "length")), 50), Start: midnight}
		at := Place{"a", s, 1.3}
		got := Spreads(r, []Site{{Place: at}}, time.UTC)
		least, most := math.Inf(1), 0.0
		for n := range got[0].Starts {
			g := total(t, r, at, fullHours([]Site{{Place: at}}, time.UTC)[n])
			least, most = min(least, g), max(most, g)
		}
		assert.InEpsilon(t, least, float64(got[0].Min), 1e-9)
		assert.InEpsilon(t, most, float64(got[0].Max), 1e-9)
	})
}
