package footprint_test

import (
	"fmt"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// The worked values in this file were computed by hand; where a standard
// prints the figure, it is named.

// TestHoleIsPricedInItsOwnHour: 1 kW for 2 h, 100 then 500 g/kWh, six minutes
// missing in the second hour: 100 + 500 g. With the run's mean intensity for
// the hole it would be 580 g, which is wrong.
func TestHoleIsPricedInItsOwnHour(t *testing.T) {
	r := open(t).powers(0, 5400, 60, "m", 1000).powers(5760, 7200, 60, "m", 1000).close(7200).
		run(plain(series(hour, 100, 500)), method)
	assert.InEpsilon(t, 600, value(t, r.Operational), 1e-12)
	assert.InEpsilon(t, 0.95, value(t, r.Coverage), 1e-12)
	assert.InEpsilon(t, 2, value(t, r.Measured), 1e-12)
	assert.Equal(t, footprint.Filled, r.Grade)
}

// TestCoverageWeighsByEnergy: meters of 300 W and 100 W, a tenth of the time
// missing in the small one.
func TestCoverageWeighsByEnergy(t *testing.T) {
	r := open(t).powers(0, 6000, 60, "big", 300).powers(0, 3000, 60, "small", 100).powers(3600, 6000, 60, "small", 100).
		close(6000).run(plain(flat(400)), method)
	assert.InEpsilon(t, 0.975, value(t, r.Coverage), 1e-12)
}

// TestEmbodiedTimeShare is the time-share example of ISO/IEC 21031:2024 (SCI):
// 1000 kg, 4 years of 365 days, reserved for 1 h: 6250/219 g, "around 28 g".
// With years of 365.25 days it would be 28.5193 g.
func TestEmbodiedTimeShare(t *testing.T) {
	r := open(t).powers(0, hour, 60, "m", 100).close(hour).run(oldMachine(), method)
	assert.InEpsilon(t, 28.538812785388128, value(t, r.Embodied), 1e-15)
	julian := 1000e3 / (4 * 365.25 * 24)
	assert.Greater(t, value(t, r.Embodied)/julian-1, 6e-4, "a year has 365 days here")
}

// oldMachine has 1000 kg of embodied emissions over 4 years.
func oldMachine() footprint.Facts {
	f := plain(flat(400))
	f.Machine.Embodied, f.Machine.Lifetime = ptr(unit.Mass(1000e3)), ptr(4*unit.Year)
	return f
}

// TestEmbodiedOfParts: M = TE x TiR/EL x RR/ToR, summed over parts
// (ISO/IEC 21031:2024).
func TestEmbodiedOfParts(t *testing.T) {
	for units, want := range map[float64]float64{4: 57.0776, 2: 28.5388} {
		t.Run(fmt.Sprintf("%v of 4 units", units), func(t *testing.T) {
			var parts []*footprint.Part
			for _, n := range []string{"1", "2"} {
				parts = append(parts, open(t, part(n, 2), reserved(units)).powers(0, hour, 60, "m", 100).close(hour).weigh(oldMachine(), method))
			}
			r := footprint.Combine(parts, method)
			assert.InDelta(t, want, value(t, r.Embodied), 5e-5)
			assert.InEpsilon(t, units/4*2*6250/219, value(t, r.Embodied), 1e-14)
			assert.InEpsilon(t, value(t, r.Operational)+value(t, r.Embodied), value(t, r.Total), 1e-15)
		})
	}
}

// TestWrapInReach: a counter of 262144 J is passed in 1310.72 s at 200 W. A
// decrease over 1200 s is one wrap; over 1400 s it may be two, and is a gap.
func TestWrapInReach(t *testing.T) {
	const wrap = 262144
	f := plain(flat(400))
	f.Machine.Rated = ptr(unit.Power(200))
	near := open(t).energy(0, "m", 200000, wrap).energy(1200, "m", 50000, 0).close(1200).run(f, method)
	assert.InEpsilon(t, (50000+wrap-200000)/3.6e6, value(t, near.Measured), 1e-14)
	assert.Equal(t, footprint.Measured, near.Grade)

	far := open(t).energy(0, "m", 200000, wrap).energy(1400, "m", 50000, 0).energy(1500, "m", 60000, 0).close(1500).run(f, method)
	assert.InEpsilon(t, 100*1500/3.6e6, value(t, far.Measured), 1e-14, "100 W, the mean of what is covered, for all of 1500 s")
	assert.InEpsilon(t, 100.0/1500, value(t, far.Coverage), 1e-14)
}

// TestRateIsSumOverSum: 100 g for 10 and 100 g for 90 units are 2 g each, not
// the mean of 10 and 1.11 (SCI = (O + M) per R, ISO/IEC 21031:2024).
func TestRateIsSumOverSum(t *testing.T) {
	var parts []*footprint.Part
	for n, done := range map[string]float64{"a": 10, "b": 90} {
		w := record.Work{Unit: "step", Done: done, OfPart: true}
		parts = append(parts, open(t, part(n, 2)).powers(0, hour, 60, "m", 1000).work(hour, w).close(hour).weigh(plain(flat(100)), method))
	}
	r := footprint.Combine(parts, method)
	assert.InEpsilon(t, 200, value(t, r.Total), 1e-14)
	assert.InEpsilon(t, 2, value(t, r.Rate), 1e-14)
}

// TestExpectedEqualsPeriodicSeries: after the end of a series of period 24 h
// the run is priced as if the series went on.
func TestExpectedEqualsPeriodicSeries(t *testing.T) {
	var week []float64
	for n := range 7 * 24 {
		week = append(week, float64(100+13*(n%24)))
	}
	ended := plain(series(hour, week...))
	goesOn := plain(series(hour, append(week, week[:24]...)...))
	at := 7*24*hour + 1800.0
	s := open(t, opensAt(at)).powers(at, at+5*hour, 60, "m", 1234).close(at + 5*hour)
	want, got := s.run(goesOn, method), s.run(ended, method)
	assert.InEpsilon(t, value(t, want.Operational), value(t, got.Operational), 1e-13)
	require.NotNil(t, got.Priced)
	assert.InEpsilon(t, 1, float64(got.Priced.Expected), 1e-14)
	assert.InEpsilon(t, 1, float64(want.Priced.Series), 1e-14)
}
