package footprint_test

import (
	"math/big"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// sites are where the drawn records run: with series of every kind, with and
// without an annual mean.
var sites = []struct {
	name   string
	series func(*rapid.T) *grid.Series
	annual bool
}{
	{"whole series", func(t *rapid.T) *grid.Series { return drawSeries(t, false) }, false},
	{"holes, annual mean", func(t *rapid.T) *grid.Series { return drawSeries(t, true) }, true},
	{"holes", func(t *rapid.T) *grid.Series { return drawSeries(t, true) }, false},
	{"series ends, annual mean", drawPast, true},
	{"series ends", drawPast, false},
	{"annual mean only", func(*rapid.T) *grid.Series { return nil }, true},
	{"nothing", func(*rapid.T) *grid.Series { return nil }, false},
}

// drawPast draws hourly values of some nights before start, a few of which are
// missing, up to some minutes after it.
func drawPast(t *rapid.T) *grid.Series {
	var steps []grid.Interval
	for back := rapid.SampledFrom([]float64{6, 9, 30}).Draw(t, "days") * 24 * hour; back > 0; back -= hour {
		other := int(back/hour)%24 > 0 && int(back/hour)%24 < 18 // most drawn records last no longer than six hours
		if other || rapid.IntRange(0, 9).Draw(t, "missing") == 0 {
			continue
		}
		steps = append(steps, grid.Interval{From: after(-back), To: after(-back + hour), I: unit.Intensity(1 + eighths(t, 900, "g"))})
	}
	tail := rapid.SampledFrom([]float64{60, 2000, hour, 9000}).Draw(t, "end")
	steps = append(steps, grid.Interval{From: after(0), To: after(tail), I: unit.Intensity(1 + eighths(t, 900, "g"))})
	return grid.NewSeries("NORTH", grid.Average, grid.Direct, steps)
}

// drawMachine draws a share or an unmetered power, and perhaps a rated power.
func drawMachine(t *rapid.T, f *footprint.Facts) {
	f.Machine.MeasuredShare = unit.Share(rapid.SampledFrom([]float64{1, 0.75, 0.5}).Draw(t, "share"))
	if rapid.Bool().Draw(t, "unmetered") {
		f.Machine.MeasuredShare, f.Machine.Unmetered = 0, ptr(unit.Power(320))
	}
	if rapid.Bool().Draw(t, "rated") {
		f.Machine.Rated = ptr(unit.Power(rapid.SampledFrom([]float64{100, 2800}).Draw(t, "rated W")))
	}
}

// TestAgainstExact compares random records of several meters, counters, gaps
// and holes with the same in rational numbers.
func TestAgainstExact(t *testing.T) {
	var priced [4]int // runs, by source
	for _, site := range sites {
		t.Run(site.name, func(t *testing.T) {
			rapid.Check(t, func(t *rapid.T) {
				f := plain(site.series(t))
				if site.annual {
					f.Site.Annual = ptr(unit.Intensity(412))
				}
				f.Site.PUE = rapid.SampledFrom([]float64{1, 1.18}).Draw(t, "PUE")
				drawMachine(t, &f)
				for n, did := range compare(t, f) {
					if did {
						priced[n]++
					}
				}
			})
		})
	}
	if !testing.Short() { // which draws too few
		assert.NotContains(t, priced, 0, "every source priced some of the records")
	}
}

// compare draws a record and weighs it both ways. It tells which sources
// priced some of it.
func compare(t *rapid.T, f footprint.Facts) (priced [4]bool) {
	d, m := drawRecord(t), method
	m.MinCoverage = unit.Share(rapid.SampledFrom([]float64{0, 0.5, 0.95}).Draw(t, "min coverage"))
	units := rapid.SampledFrom([]float64{0, 1, 4}).Draw(t, "reserved")
	want := weighExactly(d, f, m, units)
	got := d.sheet(t, reserved(units)).run(f, m)

	kwh := func(ws *big.Rat) float64 { return float(over(ws, rat(3.6e6))) }
	metered := plus(want.measured, want.filled)
	facility := plus(plus(want.energy[0], want.energy[1]), plus(want.energy[2], want.energy[3]))
	near(t, kwh(metered), value(t, got.Measured), "measured")
	near(t, kwh(facility)/f.Site.PUE, value(t, got.MachineKWh), "machine")
	near(t, kwh(facility), value(t, got.Facility), "facility")
	near(t, kwh(want.provenEnergy), float64(got.Proven.Facility), "proven energy")
	near(t, float(want.provenMass), float64(got.Proven.Total), "proven mass")
	if metered.Sign() > 0 {
		near(t, float(over(want.measured, metered)), value(t, got.Coverage), "coverage")
	} else {
		assert.Nil(t, got.Coverage)
	}
	sameHours(t, want, got)
	if facility.Sign() == 0 {
		assert.Nil(t, got.Operational)
		return priced
	}
	samePrices(t, want, got, facility, m)
	for n := range priced {
		priced[n] = want.energy[n].Sign() > 0 && got.Operational != nil
	}
	return priced
}

// sameHours adds the run's hours up to full ones and compares them.
func sameHours(t *rapid.T, want *exact, got *footprint.Run) {
	full := map[unit.Instant]float64{}
	for _, h := range got.Hours {
		full[h.From-h.From%unit.Instant(unit.Hour)] += float64(h.KWh)
	}
	assert.Len(t, full, len(want.byHour))
	for from, ws := range want.byHour {
		near(t, float(over(ws, rat(3.6e6))), full[from], from.String())
	}
}

// samePrices compares shares and mass; which sources may price is decided by
// the rule, with a margin for a share that lies at the limit.
func samePrices(t *rapid.T, want *exact, got *footprint.Run, facility *big.Rat, m footprint.Method) {
	share := func(s grid.Source) float64 { return float(over(want.energy[s], facility)) }
	limit := 1 - float64(m.MinCoverage)
	hole := share(grid.FromHole)
	require.NotNil(t, got.Priced)
	near(t, share(grid.FromSeries), float64(got.Priced.Series), "share of the series")
	near(t, share(grid.FromExpected), float64(got.Priced.Expected), "expected share")
	if want.unpriced[grid.FromAnnual] || want.unpriced[grid.FromHole] || hole > limit*(1+1e-9) {
		assert.Nil(t, got.Operational)
		assert.NotEmpty(t, got.Doubts)
		return
	}
	if hole < limit*(1-1e-9) || m.MinCoverage == 0 {
		near(t, share(grid.FromAnnual)+hole, float64(got.Priced.Annual), "annual share")
		mass := plus(plus(want.mass[0], want.mass[1]), plus(want.mass[2], want.mass[3]))
		near(t, float(mass), value(t, got.Operational), "operational")
	}
}
