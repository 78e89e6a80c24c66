package footprint_test

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// kilowatt is a run at 1 kW for some hours.
func kilowatt(t test, h float64, edits ...func(*record.Open)) *sheet {
	return open(t, edits...).powers(0, h*hour, 60, "m", 1000).close(h * hour)
}

// holed has the value 100 in every hour of a day but some.
func holed(holes ...int) *grid.Series {
	var steps []grid.Interval
	for n, s := range series(hour, make([]float64, 24)...).Steps() {
		hole := false
		for _, h := range holes {
			hole = hole || h == n
		}
		if s.I = 100; !hole {
			steps = append(steps, s)
		}
	}
	return grid.NewSeries("NORTH", grid.Average, grid.Direct, steps)
}

// TestAnnualInHoles: the annual mean prices holes up to 1 - min_coverage of
// the run's energy. At the limit it does, above it nothing is known.
func TestAnnualInHoles(t *testing.T) {
	for name, c := range map[string]struct {
		hours, minCoverage float64
		series             *grid.Series
		annual             bool
		ok                 bool
	}{
		"at the limit, 1 of 20 h":     {20, 0.95, holed(7), true, true},
		"at the limit, 1 of 10 h":     {10, 0.9, holed(7), true, true}, // 1 - 0.9 is below 0.1 in floats
		"at the limit, 3 of 10 h":     {10, 0.7, holed(1, 5, 7), true, true},
		"just above":                  {19.999, 0.95, holed(7), true, false},
		"just above by the rule":      {20, math.Nextafter(0.95, 1) + 1e-9, holed(7), true, false},
		"well above":                  {20, 0.95, holed(7, 8), true, false},
		"small, but no annual":        {20, 0.95, holed(7), false, false},
		"none allowed":                {20, 1, holed(7), true, false},
		"no hole, no annual":          {20, 1, holed(), false, true},
		"hole outside the run":        {5, 1, holed(7), false, true},
		"all allowed, all is a hole":  {1, 0, holed(0), true, true},
		"before the series, as holes": {20, 0.95, holed(0), true, true},
	} {
		t.Run(name, func(t *testing.T) {
			f, m := plain(c.series), method
			m.MinCoverage = unit.Share(c.minCoverage)
			if c.annual {
				f.Site.Annual = ptr(unit.Intensity(500))
			}
			r := kilowatt(t, c.hours).run(f, m)
			if !c.ok {
				assert.Nil(t, r.Operational)
				assert.Nil(t, r.Total)
				assert.Nil(t, r.Intensity)
				require.Len(t, r.Doubts, 1)
				assert.Contains(t, r.Doubts[0].Reason, "holes of the series for zone NORTH")
				assert.InDelta(t, 1-c.minCoverage, r.Doubts[0].Limit, 1e-12)
				assert.Zero(t, r.Priced.Annual, "what may not be used prices nothing")
				return
			}
			assert.Empty(t, r.Doubts)
			hole := float64(r.Priced.Annual)
			assert.InEpsilon(t, c.hours*(100*(1-hole)+500*hole), value(t, r.Operational), 1e-12)
			assert.InEpsilon(t, 1, float64(r.Priced.Annual+r.Priced.Series), 1e-12)
		})
	}
}

// TestAnnualProvesNothingInHoles: proven is what the series prices; holes may
// turn out to be more than is allowed.
func TestAnnualProvesNothingInHoles(t *testing.T) {
	f := plain(holed(7))
	f.Site.Annual = ptr(unit.Intensity(500))
	r := kilowatt(t, 20).run(f, method)
	assert.InEpsilon(t, 19*100+500, value(t, r.Operational), 1e-12)
	assert.InEpsilon(t, 19*100, float64(r.Proven.Total), 1e-12)
	assert.InEpsilon(t, 20, float64(r.Proven.Facility), 1e-12, "the energy is proven all the same")
}

// TestAnnualWithoutSeries: where the zone has no series at all, the annual
// mean prices everything, and that is said.
func TestAnnualWithoutSeries(t *testing.T) {
	f := plain(nil)
	f.Site.Annual = ptr(unit.Intensity(412))
	r := kilowatt(t, 2).run(f, method)
	assert.InEpsilon(t, 824, value(t, r.Operational), 1e-12)
	assert.Equal(t, &footprint.Priced{Annual: 1}, r.Priced)
	assert.Empty(t, r.Doubts)
	assert.Contains(t, r.Notes, "100 % of the energy is priced with the site's annual mean")

	f.Site.Annual = nil
	r = kilowatt(t, 2).run(f, method)
	assert.Nil(t, r.Operational)
	require.Len(t, r.Doubts, 1)
	assert.Contains(t, r.Doubts[0].Reason, "no average series for zone NORTH")
}

// TestAnnualOfOneSiteOnly: an annual mean is of its site. A part elsewhere
// without one leaves the run unpriced, whichever comes first.
func TestAnnualOfOneSiteOnly(t *testing.T) {
	with, without := plain(nil), plain(nil)
	with.Site.Annual = ptr(unit.Intensity(412))
	a, b := kilowatt(t, 1, part("a", 2)).weigh(with, method), kilowatt(t, 1, part("b", 2)).weigh(without, method)
	for _, parts := range [][]*footprint.Part{{a, b}, {b, a}} {
		r := footprint.Combine(parts, method)
		assert.Nil(t, r.Operational)
		assert.Len(t, r.Doubts, 1)
		assert.InEpsilon(t, 412, float64(r.Proven.Total), 1e-12, "what the one spent is proven")
	}
}

// TestZonesOfDoubt: a doubt about several zones names each once, in order,
// whatever the order of the parts.
func TestZonesOfDoubt(t *testing.T) {
	var parts []*footprint.Part
	for _, zone := range []string{"SOUTH", "NORTH", "SOUTH"} {
		f := plain(nil)
		f.Site.Zone = zone
		parts = append(parts, kilowatt(t, 1, part(zone, 3)).weigh(f, method))
	}
	r := footprint.Combine(parts, method)
	require.NotEmpty(t, r.Doubts)
	assert.Contains(t, r.Doubts[len(r.Doubts)-1].Reason, "zone NORTH and SOUTH")
	assert.Empty(t, r.Zone)
}

// TestAnnualIsNotMarginal: the annual mean is an average factor and never
// stands in for a marginal one, neither for a series nor in its holes.
func TestAnnualIsNotMarginal(t *testing.T) {
	m := method
	m.Factor = grid.Marginal
	for _, s := range []*grid.Series{nil, grid.NewSeries("NORTH", grid.Marginal, grid.Direct, holed(7).Steps())} {
		f := plain(s)
		f.Site.Annual = ptr(unit.Intensity(412))
		r := kilowatt(t, 20).run(f, m)
		assert.Nil(t, r.Operational)
		assert.Len(t, r.Doubts, 1)
	}
}

// TestSeriesEndsBeforeRun: the hours after its end have the expected
// intensity, and the run is provisional, which is said.
func TestSeriesEndsBeforeRun(t *testing.T) {
	var week []float64
	for d := range 7 {
		for range 24 {
			week = append(week, float64(100*(d+1)))
		}
	}
	at := 7*24*hour - hour
	s := open(t, opensAt(at)).powers(at, at+4*hour, 60, "m", 1000).close(at + 4*hour)
	f := plain(series(hour, week...))
	f.Site.Annual = ptr(unit.Intensity(9999)) // has no say
	r := s.run(f, method)
	assert.InEpsilon(t, 700+3*400, value(t, r.Operational), 1e-12)
	assert.InEpsilon(t, 0.75, float64(r.Priced.Expected), 1e-12)
	assert.InEpsilon(t, 0.25, float64(r.Priced.Series), 1e-12)
	assert.Empty(t, r.Doubts)
	require.NotEmpty(t, r.Notes)
	assert.Contains(t, r.Notes[0], "provisional: 75.0 % of the energy")
}

// TestSeriesEndsLongBefore: without seven values to look back at there is
// nothing to expect, and what is not known is not small.
func TestSeriesEndsLongBefore(t *testing.T) {
	r := open(t, opensAt(24*hour)).powers(24*hour, 26*hour, 60, "m", 1000).close(26*hour).run(plain(flat(100)), method)
	assert.Nil(t, r.Operational)
	require.Len(t, r.Doubts, 1)
	assert.Contains(t, r.Doubts[0].Reason, "no intensity")
}

// TestBrokenSeries: a series with rows that cannot be read prices, but what it
// prices is in doubt and not proven. The energy is.
func TestBrokenSeries(t *testing.T) {
	f := plain(flat(100))
	f.Site.Broken = &finding.Finding{File: "grid/north.csv", Line: 7, What: "a row", Do: "mend it"}
	r := kilowatt(t, 2).run(f, method)
	assert.InEpsilon(t, 200, value(t, r.Operational), 1e-12)
	require.Len(t, r.Doubts, 1)
	assert.Contains(t, r.Doubts[0].Reason, "grid/north.csv:7: a row")
	assert.Zero(t, r.Proven.Total)
	assert.InEpsilon(t, 2, float64(r.Proven.Facility), 1e-12)
}
