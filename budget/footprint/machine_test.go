package footprint_test

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// TestIdle: the machine's mean power x units/reserved must reach its idle
// power: 240 W for four units are 120 W for two, of which 90 W are measured.
func TestIdle(t *testing.T) {
	for name, c := range map[string]struct {
		units, w float64
		doubt    bool
	}{
		"all, at it":     {4, 180, false},
		"all, below":     {4, 179.9, true},
		"half, at it":    {2, 90, false},
		"half, below":    {2, 89.9, true},
		"not said, less": {0, 179.9, true},
	} {
		t.Run(name, func(t *testing.T) {
			f := plain(flat(400))
			f.Machine.Idle, f.Machine.MeasuredShare = ptr(unit.Power(240)), 0.75
			r := open(t, reserved(c.units)).powers(0, hour, 60, "m", c.w).close(hour).run(f, method)
			if !c.doubt {
				assert.Empty(t, r.Doubts)
				return
			}
			require.Len(t, r.Doubts, 1)
			assert.Contains(t, r.Doubts[0].Reason, "idle")
			assert.Less(t, r.Doubts[0].Observed, 240.0)
			assert.InDelta(t, 240, r.Doubts[0].Limit, 0)
			assert.False(t, r.Refuted())
		})
	}
}

// TestIdleIsOfTheMean: readings below idle are plausible as long as their mean
// is not, filled gaps included.
func TestIdleIsOfTheMean(t *testing.T) {
	f := plain(flat(400))
	f.Machine.Idle = ptr(unit.Power(240))
	r := open(t).power(0, "m", 0).power(120, "m", 480).power(hour, "m", 240).close(hour+1).run(f, method)
	assert.Empty(t, r.Doubts)
}

// TestReservedAboveUnits: a part cannot hold more than there is. Who claims so
// is charged with the whole machine.
func TestReservedAboveUnits(t *testing.T) {
	f := oldMachine()
	f.Machine.Unmetered = ptr(unit.Power(320))
	write := func(units float64) *footprint.Run {
		return open(t, reserved(units)).powers(0, hour, 60, "m", 100).close(hour).run(f, method)
	}
	assert.Empty(t, write(4).Doubts)
	r := write(4.5)
	require.Len(t, r.Doubts, 1)
	assert.Contains(t, r.Doubts[0].Reason, "4.5 of the 4 units of machine quad")
	assert.InDelta(t, 4.5, r.Doubts[0].Observed, 0)
	assert.InDelta(t, 4, r.Doubts[0].Limit, 0)
	for _, units := range []float64{4.5, 1e308} {
		assert.InEpsilon(t, value(t, write(4).Total), value(t, write(units).Total), 1e-12)
	}
}

// TestUnmetered: what the meters do not see can be declared as a power instead
// of a share. It goes on from open to close, for the units held.
func TestUnmetered(t *testing.T) {
	f := plain(series(hour, 100, 500))
	f.Machine.MeasuredShare, f.Machine.Unmetered = 0, ptr(unit.Power(320))
	f.Site.PUE = 1.5
	// The meter covers the second hour only; that and the time before its first
	// sample, which is filled, are 400 W. 160 W of two units come on top.
	r := open(t, reserved(2)).powers(hour, 2*hour, 60, "m", 400).close(2*hour).run(f, method)
	assert.InEpsilon(t, 0.8, value(t, r.Measured), 1e-13)
	assert.InEpsilon(t, 0.8+0.32, value(t, r.MachineKWh), 1e-13)
	assert.InEpsilon(t, 1.12*1.5, value(t, r.Facility), 1e-13)
	assert.InEpsilon(t, 0.56*1.5*(100+500), value(t, r.Operational), 1e-13)
	assert.InEpsilon(t, 0.5, value(t, r.Coverage), 1e-13, "coverage is of what meters measure")
	assert.InEpsilon(t, 0.4*1.5*500, float64(r.Proven.Total), 1e-13, "a declared power is not measured")
}

// TestUnmeteredIsInIdle: the machine's mean power has its unmetered part in it.
func TestUnmeteredIsInIdle(t *testing.T) {
	f := plain(flat(400))
	f.Machine.Unmetered, f.Machine.Idle = ptr(unit.Power(320)), ptr(unit.Power(520))
	for w, doubts := range map[float64]int{100: 0, 99.9: 1} {
		r := open(t, reserved(2)).powers(0, hour, 60, "m", w).close(hour).run(f, method)
		assert.Len(t, r.Doubts, doubts, "%v W and half of 320 W are %v W for the machine", w, 2*w+320)
	}
}

// TestUnmeteredRated: a reading is compared with all of rated, for there is no
// share of it that the meters see.
func TestUnmeteredRated(t *testing.T) {
	f := plain(flat(400))
	f.Machine.MeasuredShare, f.Machine.Unmetered, f.Machine.Rated = 0, ptr(unit.Power(320)), ptr(unit.Power(2800))
	for w, doubts := range map[float64]int{1400: 0, 1401: 1} {
		r := open(t, reserved(2)).powers(0, hour, 60, "m", w).close(hour).run(f, method)
		assert.Len(t, r.Doubts, doubts, "%v W", w)
	}
}
