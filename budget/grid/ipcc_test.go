package grid_test

import (
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// medians are lifecycle emissions in g/kWh (IPCC AR5 WGIII 2014, Annex III,
// Table A.III.2, medians; read in transcriptions).
var medians = map[string]float64{
	"coal PC": 820, "gas combined cycle": 490, "biomass cofiring": 740, "biomass dedicated": 230, "geothermal": 38,
	"hydropower": 24, "nuclear": 12, "concentrated solar": 27, "solar PV rooftop": 41, "solar PV utility": 48,
	"wind onshore": 11, "wind offshore": 12, "ocean": 17, "coal CCS oxyfuel": 160, "coal CCS PC": 220, "coal CCS IGCC": 200,
	"gas CC with CCS": 170,
}

// plausible checks that a lifecycle intensity can be a mix of what there is:
// no cleaner than the cleanest generation and no dirtier than the dirtiest.
func plausible(t assert.TestingT, i unit.Intensity) {
	assert.GreaterOrEqual(t, float64(i), medians["wind onshore"])
	assert.LessOrEqual(t, float64(i), medians["coal PC"])
}

// mixed is an hourly series of a grid whose mix changes at random.
func mixed(seed uint64, n int) []grid.Interval {
	r := rand.New(rand.NewPCG(seed, 0))
	steps := make([]grid.Interval, n)
	for hour := range steps {
		var sum, weight float64
		for _, name := range []string{"coal PC", "gas combined cycle", "hydropower", "nuclear", "solar PV utility", "wind onshore"} {
			w := r.ExpFloat64()
			sum, weight = sum+w*medians[name], weight+w
		}
		steps[hour] = step(float64(hour), float64(hour+1), sum/weight)
	}
	return steps
}

// TestPlausible: what comes out of files laid over one another, of the series,
// of its holes' neighbours and of the expected hours after it, is still a mix.
func TestPlausible(t *testing.T) {
	const n = 40 * day
	first, second := mixed(1, n), mixed(2, n)
	set := grid.NewSet(grid.Lifecycle,
		clean(t, "a.csv", header+rows("NORTH", grid.Average, first[:30*day]...)),
		clean(t, "b.csv", header+rows("NORTH", grid.Average, second[20*day:35*day]...)),
		clean(t, "c.csv", header+rows("NORTH", grid.Average, first[36*day:]...)))
	p := grid.Pricer{Series: set.Series("NORTH", grid.Average)}
	sources := map[grid.Source]int{}
	for at := 0.0; at < n+10*day; at += 0.5 {
		price := p.At(hours(at))
		sources[price.Source]++
		if price.Known {
			plausible(t, price.I)
		}
	}
	assert.Equal(t, map[grid.Source]int{grid.FromSeries: 2 * 39 * day, grid.FromHole: 2 * day, grid.FromExpected: 2 * 10 * day}, sources)
	i, u, ok := p.Series.Expected(hours(n))
	require.True(t, ok)
	plausible(t, i)
	assert.Greater(t, float64(u), 0.0)
	assert.Less(t, float64(u), 1.0, "a day like 28 others is known better than to a factor of two")
}
