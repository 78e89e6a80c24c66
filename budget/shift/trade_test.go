package shift

import (
	"fmt"
	"math"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/unit"
)

// Facts of the trade (common practice, no source), on series with the daily
// course and the weather of a zone with sun and wind. The limits are wide: the
// facts are about which job gains, not about how much.

// zones and starts over which a saving is averaged.
const (
	zonesTried  = 4
	startsTried = 8
)

// saving is the mean share that shifting takes off runs of a length.
func saving(t *testing.T, length unit.Duration, shifted func(Run, Place) unit.Mass) float64 {
	var sum float64
	for z := range zonesTried {
		at := Place{fmt.Sprint(z), diurnal(uint64(z)+20, 400, unit.Hour, 40), 1.2}
		for n := range startsTried {
			r := Run{Profile: flat(t, length), Start: after(unit.Duration(n) * 83 * unit.Hour)}
			sum += 1 - float64(shifted(r, at))/total(t, r, at, r.Start)
		}
	}
	return sum / zonesTried / startsTried
}

// Flexible Start within 24 h helps short jobs most and hardly helps jobs longer
// than a day.
func TestDeferredStartHelpsShortJobs(t *testing.T) {
	within := func(r Run, at Place) unit.Mass { return DeferredStart(r, at, unit.Day).Total }
	short, day, long := saving(t, unit.Hour, within), saving(t, 12*unit.Hour, within), saving(t, 72*unit.Hour, within)
	t.Logf("deferred start within 24 h saves %.1f %% of 1 h, %.1f %% of 12 h, %.1f %% of 72 h", 100*short, 100*day, 100*long)
	assert.Greater(t, short, 0.15)
	assert.Greater(t, short, day)
	assert.Greater(t, day, long)
	assert.Less(t, long, short/4)
	assert.GreaterOrEqual(t, long, 0.0)
}

// Pause and Resume with doubled total duration helps multi-day jobs most and
// short jobs little.
func TestInterruptedRunHelpsLongJobs(t *testing.T) {
	doubled := func(r Run, at Place) unit.Mass {
		return interrupted(t, r, at, Pausing{Slot: 15 * unit.Minute, MinSlice: 30 * unit.Minute, Stretch: 2, Resume: 0.01}).Total
	}
	short, day, long := saving(t, unit.Hour, doubled), saving(t, 12*unit.Hour, doubled), saving(t, 72*unit.Hour, doubled)
	t.Logf("an interrupted run of doubled duration saves %.1f %% of 1 h, %.1f %% of 12 h, %.1f %% of 72 h", 100*short, 100*day, 100*long)
	assert.Greater(t, long, 0.15)
	assert.Greater(t, long, day)
	assert.Greater(t, day, short)
	assert.Less(t, short, long/3)
	assert.GreaterOrEqual(t, short, 0.0)
}

// The cleanest of many regions emits about a third of the dirtiest. Regions
// here are between 200 and 600 g/kWh in the mean.
func TestCleanestSiteEmitsAThird(t *testing.T) {
	var sites []Site
	for n := range 16 {
		mean := 200 * math.Pow(3, float64(n)/15)
		sites = append(sites, Site{Place: Place{fmt.Sprint(n), diurnal(uint64(n), mean, unit.Hour, 20), 1.2}})
	}
	r := Run{Profile: flat(t, 24*unit.Hour), Start: after(30 * unit.Hour)}
	spread := Spreads(r, sites, time.UTC)
	require.Len(t, spread, 16)
	clean, dirty := math.Inf(1), 0.0
	for _, s := range spread {
		clean, dirty = min(clean, float64(s.Mean)), max(dirty, float64(s.Mean))
	}
	assert.InDelta(t, 1./3, clean/dirty, 0.1)
}
