package shift

import (
	"encoding/json"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/unit"
)

// The check values K of the numbers' section 8, worked by hand.

func TestDeferredTriangle(t *testing.T) {
	p := linear(t, unit.Hour, Sample{0, 0}, Sample{unit.Hour / 2, 2000}, Sample{unit.Hour, 0})
	zone := series(unit.Hour/2, 300, 300, 100, 300, 300, 300)
	d := DeferredStart(Run{Profile: p, Start: midnight}, Place{"quay", zone, 1}, 2*unit.Hour)
	require.NotNil(t, d)
	assert.Equal(t, after(2700*unit.Second), d.Start)
	assert.InDelta(t, 150, float64(d.Total), 1e-9)
	assert.InDelta(t, 300-150, float64(*d.Saves), 1e-9)
	assert.Equal(t, 7200.0, d.Window)
	// Breakpoints alone: a sample of the profile on a step of the series.
	for _, start := range []unit.Duration{unit.Hour / 2, unit.Hour} {
		assert.InDelta(t, 200, total(t, Run{Profile: p}, Place{"quay", zone, 1}, after(start)), 1e-9)
	}
}

func TestInterruptedOfFourHours(t *testing.T) {
	zone := series(unit.Hour, 500, 100, 500, 100)
	r := Run{Profile: flat(t, 2*unit.Hour), Start: midnight}
	hour := func(from, to int) Span {
		return Span{after(unit.Duration(from) * unit.Hour), after(unit.Duration(to) * unit.Hour)}
	}
	for _, c := range []struct {
		resume unit.Energy
		total  float64
		slots  []Span
	}{
		{0, 200, []Span{hour(1, 2), hour(3, 4)}},
		{0.3, 230, []Span{hour(1, 2), hour(3, 4)}},
		{5, 600, []Span{hour(0, 2)}}, // hours 0-1, 1-2 and 2-3 cost the same: the first
	} {
		i := interrupted(t, r, Place{"quay", zone, 1}, Pausing{Slot: unit.Hour, Stretch: 2, Resume: c.resume})
		require.NotNil(t, i)
		assert.InDelta(t, c.total, float64(i.Total), 1e-9)
		assert.Equal(t, c.slots, i.Slots)
		assert.Equal(t, len(c.slots)-1, i.Resumes)
		assert.InDelta(t, 600-c.total, float64(*i.Saves), 1e-9)
		assert.Equal(t, unit.Intensity(100), i.At)
		assert.InDelta(t, 200+100*float64(c.resume), float64(i.Threshold.Total), 1e-9)
	}
}

// PUE scales operational emissions and the cost of a resume; embodied ones are
// for the time the machine is held, and a pause releases it.
func TestInterruptedWithPUEAndEmbodied(t *testing.T) {
	r := Run{Profile: flat(t, 2*unit.Hour), Start: midnight, Embodied: 0.01}
	at := Place{"quay", series(unit.Hour, 500, 100, 500, 100), 1.5}
	i := interrupted(t, r, at, Pausing{Slot: unit.Hour, Stretch: 2, Resume: 0.3})
	assert.InDelta(t, 230*1.5+72, float64(i.Total), 1e-9)
	assert.InDelta(t, 600*1.5+72, float64(Was(r, at).Total), 1e-9)
}

func TestLastSliceMayBeShort(t *testing.T) {
	zone := series(unit.Hour, 100, 100, 900, 100, 900)
	r := Run{Profile: flat(t, 3*unit.Hour), Start: midnight}
	i := interrupted(t, r, Place{"quay", zone, 1}, Pausing{Slot: unit.Hour, MinSlice: 2 * unit.Hour, Stretch: 5. / 3})
	assert.InDelta(t, 300, float64(i.Total), 1e-9)
	assert.Equal(t, []Span{{after(0), after(2 * unit.Hour)}, {after(3 * unit.Hour), after(4 * unit.Hour)}}, i.Slots)
	// A first slice of one hour is not allowed: it waits for no better one.
	zone = series(unit.Hour, 100, 900, 100, 100, 900)
	i = interrupted(t, r, Place{"quay", zone, 1}, Pausing{Slot: unit.Hour, MinSlice: 2 * unit.Hour, Stretch: 5. / 3})
	assert.InDelta(t, 1100, float64(i.Total), 1e-9)
	assert.Zero(t, i.Resumes)
}

// The last slot of work may be short, and then needs only its part of a slot.
func TestShortLastSlot(t *testing.T) {
	zone := series(unit.Hour/2, 500, 500, 100, hole)
	r := Run{Profile: flat(t, 90*unit.Minute), Start: midnight}
	i := interrupted(t, r, Place{"quay", zone, 1}, Pausing{Slot: unit.Hour, Stretch: 1})
	require.NotNil(t, i)
	assert.InDelta(t, 550, float64(i.Total), 1e-9)
	assert.Equal(t, []Span{{midnight, after(90 * unit.Minute)}}, i.Slots)
}

func TestKeysOfThePause(t *testing.T) {
	r := Run{Profile: flat(t, 2*unit.Hour), Start: midnight}
	at := Place{"quay", series(unit.Hour, 500, 100, 500, 100), 1}
	text, err := json.Marshal(Report{Format: 1, Job: "tide", Run: "r1", Energy: 2, Duration: 7200, Factor: "average",
		AsRun: Was(r, at), Pause: interrupted(t, r, at, Pausing{Slot: unit.Hour, Stretch: 2, Resume: 0.3})})
	require.NoError(t, err)
	assert.JSONEq(t, `{"format":1,"job":"tide","run":"r1","energy_kwh":2,"duration_s":7200,"factor":"average",
		"as_run":{"site":"quay","start":"2031-03-01T00:00:00Z","total_g":600},
		"pause":{"site":"quay","slots":[{"from":"2031-03-01T01:00:00Z","to":"2031-03-01T02:00:00Z"},{"from":"2031-03-01T03:00:00Z","to":"2031-03-01T04:00:00Z"}],
		"resumes":1,"resume_kwh":0.3,"total_g":230,"saves_g":370,"threshold_g_per_kwh":100,"threshold_total_g":230,"stretch":2}}`, string(text))
}
