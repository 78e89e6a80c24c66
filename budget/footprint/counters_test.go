package footprint_test

import (
	"testing"

	"github.com/stretchr/testify/assert"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

func steps(done float64) record.Work { return record.Work{Unit: "step", Done: done} }

// TestCounterCoversAnyLength: a counter that grows has measured all the time
// between its readings, however far they are apart, at constant power.
func TestCounterCoversAnyLength(t *testing.T) {
	r := open(t).energy(0, "m", 1e6, 0).energy(4*hour, "m", 1e6+4*3.6e6, 0).close(4*hour).
		run(plain(series(hour, 100, 200, 300, 400)), method)
	assert.InEpsilon(t, 1000, value(t, r.Operational), 1e-13)
	assert.InEpsilon(t, 1, value(t, r.Coverage), 1e-15)
	assert.Equal(t, footprint.Measured, r.Grade)
}

// TestCounterEdges: the time before its first and after its last reading holds
// the power of the nearest interval, where it is short; else it is a gap.
func TestCounterEdges(t *testing.T) {
	// 100 W for 600 s, then 300 W for 600 s.
	counter := func(first float64) *sheet {
		return open(t).energy(first, "m", 0, 0).energy(first+600, "m", 60e3, 0).energy(first+1200, "m", 240e3, 0)
	}
	short := counter(120).close(120+1200+120).run(plain(flat(400)), method)
	assert.InEpsilon(t, (120*100+240e3+120*300)/3.6e6, value(t, short.Measured), 1e-14)
	assert.InEpsilon(t, 1, value(t, short.Coverage), 1e-15)

	long := counter(121).close(121+1200+121).run(plain(flat(400)), method)
	assert.InEpsilon(t, (242*200+240e3)/3.6e6, value(t, long.Measured), 1e-14)
	assert.InEpsilon(t, 1200.0/1442, value(t, long.Coverage), 1e-14)
}

// TestCounterDecrease: what a decrease means depends on what is known.
func TestCounterDecrease(t *testing.T) {
	const wrap = 100e3
	for name, c := range map[string]struct {
		wrap, rated float64 // 0 is not said
		length      float64 // of the interval, s; the counter goes from 90 kJ to 20 kJ
		covered     bool
	}{
		"reset, no wrap known":            {0, 0, 60, false},
		"reset, rated known":              {0, 2000, 60, false},
		"wrap, short":                     {wrap, 0, 60, true},
		"wrap, max_gap":                   {wrap, 0, 120, true},
		"wrap, longer than max_gap":       {wrap, 0, 120.001, false},
		"wrap, rated says once":           {wrap, 100, 999, true},
		"wrap, rated says perhaps twice":  {wrap, 100, 1000, false},
		"wrap, rated, short but perhaps":  {wrap, 2000, 50, false},
		"wrap, rated, short and only one": {wrap, 2000, 49.999, true},
	} {
		t.Run(name, func(t *testing.T) {
			f := plain(flat(400))
			if c.rated > 0 {
				f.Machine.Rated = ptr(unit.Power(c.rated))
			}
			r := open(t).energy(0, "m", 90e3, c.wrap).energy(c.length, "m", 20e3, 0).energy(c.length+10, "m", 20.5e3, 0).
				close(c.length+10).run(f, method)
			if c.covered {
				assert.InEpsilon(t, 30.5e3/3.6e6, value(t, r.Measured), 1e-12)
				assert.InEpsilon(t, 1, value(t, r.Coverage), 1e-15)
				return
			}
			assert.InEpsilon(t, 10/(c.length+10), value(t, r.Coverage), 1e-12)
			assert.InEpsilon(t, 50*(c.length+10)/3.6e6, value(t, r.Measured), 1e-12)
		})
	}
}

// TestCounterMayHaveWrappedUnseen: where the rated power allows a full turn
// within the interval, an increase proves nothing either.
func TestCounterMayHaveWrappedUnseen(t *testing.T) {
	f := plain(flat(400))
	f.Machine.Rated = ptr(unit.Power(1000))
	// 100 kJ at 1000 W: one turn in 100 s. 20 kJ in 40 s, 30 kJ in 100 s.
	r := open(t).energy(0, "m", 0, 100e3).energy(40, "m", 20e3, 0).energy(140, "m", 50e3, 0).close(140).run(f, method)
	assert.InEpsilon(t, 40.0/140, value(t, r.Coverage), 1e-14)
	assert.InEpsilon(t, 500*140/3.6e6, value(t, r.Measured), 1e-14)

	// Without rated an increase is taken as it is, whatever the length.
	r = open(t).energy(0, "m", 0, 100e3).energy(1000, "m", 20e3, 0).close(1000).run(plain(flat(400)), method)
	assert.InEpsilon(t, 20e3/3.6e6, value(t, r.Measured), 1e-14)
	assert.Equal(t, footprint.Measured, r.Grade)
}

// TestRatedOfWhatMetersSee: the power that can pass a counter is rated x
// measured share x reserved/units: 2800 x 0.75 x 2/4 = 1050 W.
func TestRatedOfWhatMetersSee(t *testing.T) {
	f := plain(flat(400))
	f.Machine.Rated, f.Machine.MeasuredShare = ptr(unit.Power(2800)), 0.75
	for length, covered := range map[float64]float64{99.99: 1, 100: 10.0 / 110} {
		r := open(t, reserved(2)).energy(0, "m", 0, 105e3).energy(length, "m", 20e3, 0).energy(length+10, "m", 22e3, 0).close(length+10).run(f, method)
		assert.InEpsilon(t, covered, value(t, r.Coverage), 1e-14, length)
	}
}

// TestResetInMidRun: the counters of a machine that was restarted go on from
// zero; the energy around the reset is filled, the rest is measured.
func TestResetInMidRun(t *testing.T) {
	r := open(t).energy(0, "m", 500e3, 0).energy(600, "m", 560e3, 0).energy(660, "m", 100, 0).energy(1260, "m", 180100, 0).
		close(1260).run(plain(flat(400)), method)
	assert.InEpsilon(t, (60e3+180e3+200*60)/3.6e6, value(t, r.Measured), 1e-14)
	assert.InEpsilon(t, 240e3/252e3, value(t, r.Coverage), 1e-14)
	assert.Equal(t, footprint.Filled, r.Grade)
}

// TestResetBesideAnEdge: where the first or the last interval is a gap, the
// edge beside it has no power to hold and belongs to the gap.
func TestResetBesideAnEdge(t *testing.T) {
	r := open(t).energy(60, "m", 500e3, 0).energy(120, "m", 0, 0).energy(220, "m", 10e3, 0).close(220).run(plain(flat(400)), method)
	assert.InEpsilon(t, 100.0/220, value(t, r.Coverage), 1e-14)
	assert.InEpsilon(t, 100*220/3.6e6, value(t, r.Measured), 1e-14)

	r = open(t).energy(0, "m", 500e3, 0).energy(100, "m", 510e3, 0).energy(160, "m", 0, 0).close(220).run(plain(flat(400)), method)
	assert.InEpsilon(t, 100.0/220, value(t, r.Coverage), 1e-14)
	assert.InEpsilon(t, 100*220/3.6e6, value(t, r.Measured), 1e-14)
}

// TestWrapCloseToTheTop: a tenth of a joule over the wrap is a difference of
// large numbers, and still exact.
func TestWrapCloseToTheTop(t *testing.T) {
	const wrap = 262143.32885
	last := wrap - 0.0625
	r := open(t).energy(0, "m", last, wrap).energy(60, "m", 0.0625, 0).close(60).run(plain(flat(400)), method)
	assert.InEpsilon(t, (wrap-last+0.0625)/3.6e6, value(t, r.Measured), 1e-15)
}
