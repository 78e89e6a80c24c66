package footprint_test

import (
	"fmt"
	"runtime"
	"testing"

	"github.com/stretchr/testify/assert"

	"budgetcheck/budget/footprint"
)

// TestGapAtItsLimit: samples exactly max_gap apart are bridged linearly; a
// nanosecond more leaves a gap.
func TestGapAtItsLimit(t *testing.T) {
	bridged := open(t).power(0, "m", 100).power(120, "m", 300).close(120).run(plain(flat(400)), method)
	assert.InEpsilon(t, 200*120/3.6e6, value(t, bridged.Measured), 1e-14)
	assert.Equal(t, footprint.Measured, bridged.Grade)

	m := method
	m.MaxGap--
	gap := open(t).power(0, "m", 100).power(120, "m", 300).power(180, "m", 300).close(180).run(plain(flat(400)), m)
	assert.InEpsilon(t, 300*180/3.6e6, value(t, gap.Measured), 1e-14, "only the last minute is covered, at 300 W")
	assert.InEpsilon(t, 1.0/3, value(t, gap.Coverage), 1e-14)
	assert.Equal(t, footprint.Filled, gap.Grade)
}

// TestEdges: a short time from open to the first sample, or from the last to
// close, holds that sample; a longer one is a gap.
func TestEdges(t *testing.T) {
	for name, c := range map[string]struct {
		first, last, end float64
		measured         float64 // Ws
		coverage         float64
	}{
		"both short":  {120, 240, 360, 120*100 + 120*200 + 120*300, 1},
		"long first":  {121, 241, 361, 361 * (120*200 + 120*300) / 240, 240.0 / 361},
		"long last":   {120, 240, 361, 361 * (120*100 + 120*200) / 240, 240.0 / 361},
		"both long":   {130, 250, 380, 380 * 200, 120.0 / 380},
		"no edges":    {0, 120, 120, 120 * 200, 1},
		"one at each": {0, 0, 100, 100 * 100, 1},
	} {
		t.Run(name, func(t *testing.T) {
			s := open(t).power(c.first, "m", 100)
			if c.last > c.first {
				s.power(c.last, "m", 300)
			}
			r := s.close(c.end).run(plain(flat(400)), method)
			assert.InEpsilon(t, c.measured/3.6e6, value(t, r.Measured), 1e-14)
			assert.InEpsilon(t, c.coverage, value(t, r.Coverage), 1e-14)
			assert.Empty(t, r.Doubts)
		})
	}
}

// TestGapsOverManyHours: what fills a gap is the mean over all that is
// covered, also of hours after it, and each hour of the gap has its own price.
// 600 W for an hour, two hours of nothing, 1200 W for an hour.
func TestGapsOverManyHours(t *testing.T) {
	r := open(t).powers(0, hour, 60, "m", 600).powers(3*hour, 4*hour, 60, "m", 1200).close(4*hour).
		run(plain(series(hour, 100, 200, 300, 400)), method)
	assert.InEpsilon(t, 0.6*100+0.9*200+0.9*300+1.2*400, value(t, r.Operational), 1e-13)
	assert.InEpsilon(t, 0.5, value(t, r.Coverage), 1e-13)
}

// TestGapIsOfItsMeter: each meter's gaps are filled with its own mean.
func TestGapIsOfItsMeter(t *testing.T) {
	r := open(t).powers(0, hour, 60, "a", 1000).powers(0, hour, 60, "b", 10).powers(hour+60, 2*hour, 60, "a", 1000).close(2*hour).
		run(plain(series(hour, 100, 300)), method)
	assert.InEpsilon(t, 1*100+1*300+0.01*100+0.01*300, value(t, r.Operational), 1e-13)
	assert.InEpsilon(t, 2.01/2.02, value(t, r.Coverage), 1e-13)
	p := r.Pieces[0]
	assert.Equal(t, "b", p.Meters[1].Name)
	assert.InEpsilon(t, 0.01, float64(p.Meters[1].Measured), 1e-13)
	assert.InEpsilon(t, 0.01, float64(p.Meters[1].Filled), 1e-13)
	assert.Zero(t, p.Meters[0].Filled)
}

// TestDeadMeter: a meter that covers no time, or counts nothing, is no proof
// of zero.
func TestDeadMeter(t *testing.T) {
	for name, c := range map[string]struct {
		write func(*sheet) *sheet
		want  string
	}{
		"one sample, far from both ends": {func(s *sheet) *sheet { return s.power(1800, "dead", 100) }, "meter dead of run.ndjson has no covered time"},
		"zero all the time":              {func(s *sheet) *sheet { return s.powers(0, hour, 60, "dead", 0) }, "meter dead of run.ndjson measured no energy over the run"},
		"a counter that stands still":    {func(s *sheet) *sheet { return s.energy(0, "dead", 5, 0).energy(hour, "dead", 5, 0) }, "meter dead of run.ndjson measured no energy over the run"},
		"a counter read once":            {func(s *sheet) *sheet { return s.energy(10, "dead", 5, 0) }, "meter dead of run.ndjson has no covered time"},
		"a counter that only falls":      {func(s *sheet) *sheet { return s.energy(0, "dead", 5, 0).energy(60, "dead", 4, 0) }, "meter dead of run.ndjson has no covered time"},
	} {
		t.Run(name, func(t *testing.T) {
			r := c.write(open(t).powers(0, hour, 60, "m", 100)).close(hour).run(plain(flat(400)), method)
			assert.Equal(t, []string{c.want}, reasons(r))
			assert.False(t, r.Known())
			assert.False(t, r.Refuted(), "what the other meter measured is spent all the same")
			assert.InEpsilon(t, 0.1, float64(r.Proven.Facility), 1e-13)
		})
	}
}

// TestZeroNowAndThen: a meter may read zero as long as it does not always.
func TestZeroNowAndThen(t *testing.T) {
	r := open(t).powers(0, hour, 60, "m", 100).powers(0, 1800, 60, "b", 0).powers(1860, hour, 60, "b", 1).close(hour).
		run(plain(flat(400)), method)
	assert.Empty(t, r.Doubts)
}

// TestInstantRun: open and close at one moment hold no time to cover.
func TestInstantRun(t *testing.T) {
	r := open(t).power(0, "m", 100).close(0).run(plain(flat(400)), method)
	assert.Nil(t, r.Coverage)
	assert.Nil(t, r.Operational, "no energy has no emissions, not zero")
	assert.False(t, r.Known())
	assert.Equal(t, []string{"meter m of run.ndjson has no covered time"}, reasons(r))
}

// TestKilledJob: without a close line the run failed at its latest time, which
// a work line can be; the energy up to then counts.
func TestKilledJob(t *testing.T) {
	r := open(t).powers(0, 600, 60, "m", 1000).work(660, steps(5)).run(plain(flat(400)), method)
	assert.Equal(t, after(660), r.End)
	assert.EqualValues(t, "failed", r.Outcome)
	assert.InEpsilon(t, 1000*660/3.6e6, value(t, r.Measured), 1e-14)
}

// TestGapsOfManyMeters: a small record can leave years of gaps in a thousand
// meters. It must not take memory for each hour of each of them.
func TestGapsOfManyMeters(t *testing.T) {
	const meters = 1000
	s := open(t)
	for n := range meters {
		s.power(0, fmt.Sprintf("m%d", n), 100).power(60, fmt.Sprintf("m%d", n), 100)
	}
	s.close(2 * 365 * 24 * hour)
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	r := s.run(plain(nil), method)
	runtime.ReadMemStats(&after)
	assert.Less(t, after.TotalAlloc-before.TotalAlloc, uint64(64<<20))
	assert.InEpsilon(t, meters*0.1*2*365*24, value(t, r.Measured), 1e-12)
}
