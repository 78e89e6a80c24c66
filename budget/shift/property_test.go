package shift

import (
	"math"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/unit"
)

// drawnBy is a small random run for a property.
func drawnBy(t *rapid.T) drawn {
	return draw(rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 3)))
}

func TestStretchOneIsAsRun(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d := drawnBy(t)
		slot := unit.Duration(rapid.Int64Range(int64(unit.Second)/2, int64(30*unit.Second)).Draw(t, "slot"))
		i, was := interrupted(t, d.Run, d.Place, Pausing{Slot: slot, MinSlice: 3 * slot, Stretch: 1}), Was(d.Run, d.Place)
		if was == nil {
			assert.Nil(t, i)
			return
		}
		require.NotNil(t, i)
		assert.InDelta(t, float64(was.Total), float64(i.Total), 1e-13)
		assert.Equal(t, []Span{{d.Start, d.Start.Add(d.Profile.Duration())}}, i.Slots)
	})
}

// What allows more never costs more, and the threshold run is one of the ways
// to pause where slices may be single slots.
func TestFreedomNeverCosts(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d := drawnBy(t)
		slot := d.Profile.Duration()/unit.Duration(rapid.IntRange(1, 12).Draw(t, "slots")) + 1
		how := Pausing{Slot: slot, MinSlice: 2 * slot, Stretch: 1.5, Resume: 1e-4}
		strict := interrupted(t, d.Run, d.Place, how)
		if strict == nil {
			return
		}
		most := float64(strict.Total)*(1+1e-8) + 1e-13
		for _, free := range []Pausing{{slot, slot, 1.5, 1e-4}, {slot, 2 * slot, 2.5, 1e-4}, {slot, 2 * slot, 1.5, 0}} {
			i := interrupted(t, d.Run, d.Place, free)
			require.NotNil(t, i)
			assert.LessOrEqual(t, float64(i.Total), most, "%+v", free)
			if free.MinSlice == slot && i.Threshold != nil {
				assert.LessOrEqual(t, float64(i.Total), float64(i.Threshold.Total)*(1+1e-8)+1e-13)
			}
		}
		if wide, narrow := DeferredStart(d.Run, d.Place, 20*unit.Second), DeferredStart(d.Run, d.Place, 5*unit.Second); narrow != nil {
			assert.LessOrEqual(t, float64(wide.Total), float64(narrow.Total)*(1+1e-8)+1e-13)
		}
	})
}

// Periodic and flat series make all starts alike: the earliest is taken, however
// rounding falls.
func TestTiesGoToTheEarliest(t *testing.T) {
	values := make([]float64, 96)
	for n := range values {
		values[n] = 300 + 100.1*math.Sin(float64(n)*math.Pi/12)
	}
	r := Run{Profile: flat(t, unit.Day), Start: after(1234567 * unit.Second / 1000)}
	d := DeferredStart(r, Place{"quay", series(unit.Hour, values...), 1.2}, 2*unit.Day)
	assert.Equal(t, r.Start, d.Start, "a whole period costs the same from any hour on")
	for n := range values {
		values[n] = 0.1
	}
	r.Profile = wavy(t, 10*unit.Hour, 100)
	at := Place{"quay", series(unit.Hour, values...), 1.2}
	assert.Equal(t, r.Start, DeferredStart(r, at, 2*unit.Day).Start)
	i := interrupted(t, r, at, Pausing{Slot: 7 * unit.Minute, Stretch: 2})
	assert.Zero(t, i.Resumes)
	assert.Equal(t, r.Start, i.Slots[0].From)
}

// Steps are a profile with jumps.
func TestConstantIsLinearWithJumps(t *testing.T) {
	books, err := Constant(90*unit.Minute, []Step{{0, 1}, {unit.Hour, 2}})
	require.NoError(t, err)
	jumps := linear(t, 90*unit.Minute, Sample{0, 1000}, Sample{unit.Hour, 1000}, Sample{unit.Hour, 4000})
	assert.Equal(t, unit.Energy(3), books.Energy())
	for at := unit.Duration(0); at <= 90*unit.Minute; at += 7 * unit.Minute {
		assert.InDelta(t, jumps.until(at), books.until(at), 1e-12, "%s", at)
	}
}

func TestRefusedInputs(t *testing.T) {
	for name, samples := range map[string][]Sample{
		"none":     nil,
		"order":    {{unit.Minute, 1}, {0, 1}},
		"early":    {{-1, 1}},
		"late":     {{unit.Hour + 1, 1}},
		"negative": {{0, -1}},
		"infinite": {{0, unit.Power(math.Inf(1))}},
		"NaN":      {{0, unit.Power(math.NaN())}},
	} {
		_, err := Linear(unit.Hour, samples)
		assert.Error(t, err, name)
	}
	_, err := Linear(0, []Sample{{0, 1}})
	assert.Error(t, err, "no duration")
	for name, steps := range map[string][]Step{
		"none":     nil,
		"not at 0": {{1, 1}},
		"order":    {{0, 1}, {0, 1}},
		"late":     {{0, 1}, {unit.Hour, 1}},
		"negative": {{0, -1}},
	} {
		_, err := Constant(unit.Hour, steps)
		assert.Error(t, err, name)
	}
	r := Run{Profile: flat(t, unit.Hour), Start: midnight}
	for name, how := range map[string]Pausing{
		"slot":    {0, 0, 2, 0},
		"slice":   {unit.Minute, -1, 2, 0},
		"stretch": {unit.Minute, 0, 0.99, 0},
		"NaN":     {unit.Minute, 0, math.NaN(), 0},
		"resume":  {unit.Minute, 0, 2, -1},
		"size":    {1, 0, 2, 0},
		"endless": {unit.Minute, 0, math.Inf(1), 0},
	} {
		_, err := InterruptedRun(r, Place{"quay", series(unit.Hour, 1, 1), 1}, how)
		assert.Error(t, err, name)
	}
}

func TestNothingWithoutASeries(t *testing.T) {
	r, at := Run{Profile: flat(t, unit.Hour), Start: midnight}, Place{Name: "quay", PUE: 1}
	assert.Nil(t, Was(r, at))
	assert.Nil(t, DeferredStart(r, at, unit.Day))
	assert.Nil(t, interrupted(t, r, at, Pausing{Slot: unit.Minute, Stretch: 2}))
}
