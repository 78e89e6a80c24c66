package grid_test

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// TestPriceOrder: the series; after its last interval the expected intensity;
// the annual mean only where the zone has no series, or as the price of a hole.
func TestPriceOrder(t *testing.T) {
	annual := unit.Intensity(412)
	short := hourly(100, 110, 120)                   // too little for an expected value
	long := daily(100, 100, 100, 100, 100, 100, 100) // 02:00 to 03:00 of seven days
	week := hourly(repeated([]float64{100}, 7*day)...)
	none, holes := (*grid.Series)(nil), north(step(0, 1, 100), step(2, 3, 120.000)) // 01:00 to 02:00 is a hole
	for name, c := range map[string]struct {
		series *grid.Series
		at     float64
		annual bool
		want   grid.Price
	}{
		"in the series":              {short, 1.5, true, grid.Price{Source: grid.FromSeries, I: 110, Known: true}},
		"in the series, no annual":   {short, 1.5, false, grid.Price{Source: grid.FromSeries, I: 110, Known: true}},
		"no series":                  {none, 1.5, true, grid.Price{Source: grid.FromAnnual, I: 412, Known: true}},
		"no series, no annual":       {none, 1.5, false, grid.Price{Source: grid.FromAnnual}},
		"in a hole":                  {holes, 1, true, grid.Price{Source: grid.FromHole, I: 412, Known: true}},
		"in a hole, no annual":       {holes, 1, false, grid.Price{Source: grid.FromHole}},
		"before the series":          {short, -1, true, grid.Price{Source: grid.FromHole, I: 412, Known: true}},
		"before, no annual":          {short, -1, false, grid.Price{Source: grid.FromHole}},
		"the end itself is after":    {week, 7 * day, true, grid.Price{Source: grid.FromExpected, I: 100, Known: true}},
		"after, expected":            {long, 7*day + 2, true, grid.Price{Source: grid.FromExpected, I: 100, Known: true}},
		"after, expected, no annual": {long, 7*day + 2.999, false, grid.Price{Source: grid.FromExpected, I: 100, Known: true}},
		"after, nothing to expect":   {short, 4, true, grid.Price{Source: grid.FromHole, I: 412, Known: true}},
		"after, nothing at all":      {short, 4, false, grid.Price{Source: grid.FromHole}},
		"hole that could be guessed": {long, 6*day + 2 - 1, false, grid.Price{Source: grid.FromHole}},
		"long after: six are left":   {long, 29*day + 2, false, grid.Price{Source: grid.FromHole}},
		"long after: seven are left": {long, 28*day + 2, false, grid.Price{Source: grid.FromExpected, I: 100, Known: true}},
	} {
		t.Run(name, func(t *testing.T) {
			p := grid.Pricer{Series: c.series}
			if c.annual {
				p.Annual = &annual
			}
			got := p.At(hours(c.at))
			got.Until = 0
			if !got.Known {
				got.I = 0 // has no meaning
			}
			assert.Equal(t, c.want, got)
		})
	}
}

// TestPriceOfHoleIsNotExpected: within the series nothing is guessed, even
// where 28 days before could be looked at.
func TestPriceOfHoleIsNotExpected(t *testing.T) {
	values := repeated([]float64{300}, 30*day)
	steps := hourly(values...).Steps()
	holed := append(append([]grid.Interval{}, steps[:29*day]...), steps[29*day+1:]...)
	got := grid.Pricer{Series: north(holed...)}.At(hours(29 * day))
	assert.Equal(t, grid.FromHole, got.Source)
	assert.False(t, got.Known)
}

// TestPriceOfExpected: it comes with its uncertainty, other prices with none.
func TestPriceOfExpected(t *testing.T) {
	p := grid.Pricer{Series: daily(100, 200, 300, 400, 500, 600, 700)}
	i, u, _ := p.Series.Expected(hours(7*day + 2))
	got := p.At(hours(7*day + 2))
	assert.Equal(t, grid.Price{Until: hours(7*day + 3), I: i, U: u, Source: grid.FromExpected, Known: true}, got)
	assert.InDelta(t, 0.577, float64(u), 0.001)
	assert.Zero(t, p.At(hours(2)).U)
}

// TestUntil: a price holds to the very end of its span, and spans get on: so
// many of them reach any moment.
func TestUntil(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p := drawPricer(t)
		at := hours(rapid.Float64Range(-30, 80*day).Draw(t, "at"))
		if _, end := p.Series.Span(); rapid.Bool().Draw(t, "soon after the end") {
			at = end + at%unit.Instant(2*unit.Day)
		}
		price := p.At(at)
		require.Greater(t, price.Until, at)
		length := int64(min(price.Until.Sub(at), 400*unit.Day))
		for _, later := range []unit.Instant{price.Until - 1, at + unit.Instant(rapid.Int64Range(0, length-1).Draw(t, "later"))} {
			if later < at.Add(400*unit.Day) {
				assert.Equal(t, price, p.At(later), "%s to %s, at %s", at, price.Until, later)
			}
		}
	})
}

// drawPricer draws up to 40 days of hours and quarters of hours, with holes.
func drawPricer(t *rapid.T) (p grid.Pricer) {
	var steps []grid.Interval
	at := 0.0
	for range rapid.IntRange(1, 40*day/6).Draw(t, "steps") {
		length := rapid.SampledFrom([]float64{0.25, 1, 6, 12}).Draw(t, "length")
		steps = append(steps, step(at, at+length, float64(rapid.IntRange(0, 900).Draw(t, "g"))))
		at += length + rapid.SampledFrom([]float64{0, 0, 0, 0.5, 30}).Draw(t, "hole")
	}
	if rapid.Bool().Draw(t, "annual") {
		annual := unit.Intensity(412)
		p.Annual = &annual
	}
	p.Series = north(steps...)
	return p
}

// TestUntilOfExpected: an expected price may change wherever one of the 28 days
// before does: here at 05:00 of one of them, of all others only at midnight.
func TestUntilOfExpected(t *testing.T) {
	for back := 1; back <= 29; back++ {
		var steps []grid.Interval
		for n := range 29 {
			from := float64(n * day)
			if back == 29-n {
				steps = append(steps, step(from, from+5, 900))
				from += 5
			}
			steps = append(steps, step(from, float64((n+1)*day), 100))
		}
		until := 29*day + 5.0
		if back == 29 { // too old
			until = 30 * day
		}
		p := grid.Pricer{Series: north(steps...)}
		assert.Equal(t, hours(until), p.At(hours(29*day)).Until, "%d days back", back)
		assert.Equal(t, hours(until), p.At(hours(29*day+4.9)).Until, "%d days back", back)
	}
}

// TestUntilIsNoShorter: within a series a price holds as long as its step, and
// in a hole as long as the hole, so that an hour is not cut for nothing.
func TestUntilIsNoShorter(t *testing.T) {
	p := grid.Pricer{Series: north(step(0, 1, 100), step(2, 4, 120))}
	for at, until := range map[float64]float64{-5: 0, 0: 1, 0.99: 1, 1: 2, 1.5: 2, 2: 4, 3.9: 4} {
		assert.Equal(t, hours(until), p.At(hours(at)).Until, at)
	}
	forever := grid.Pricer{}.At(hours(0)).Until
	assert.Greater(t, forever, hours(24*365*200), "without a series the price never changes")
	assert.Equal(t, forever, p.At(hours(4+29*day)).Until, "nor four weeks after its end")
}
