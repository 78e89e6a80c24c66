package footprint_test

import (
	"testing"

	"github.com/stretchr/testify/assert"

	"budgetcheck/budget/footprint"
)

// TestUsedIsConstantPower: a total is spread evenly over its span and priced
// hour by hour: 3 kWh from 00:30 to 02:30.
func TestUsedIsConstantPower(t *testing.T) {
	r := open(t, opensAt(1800)).used(1800, 9000, 3, true).close(9000).run(plain(series(hour, 100, 200, 400)), method)
	assert.InEpsilon(t, 0.75*100+1.5*200+0.75*400, value(t, r.Operational), 1e-13)
	assert.InEpsilon(t, 3, value(t, r.Measured), 1e-14)
	assert.Equal(t, footprint.Averaged, r.Grade)
	assert.Empty(t, r.Doubts)
	assert.InEpsilon(t, 1, value(t, r.Coverage), 1e-15)
}

// TestUsedGrades: one estimated total makes the run an estimate.
func TestUsedGrades(t *testing.T) {
	for name, c := range map[string]struct {
		first, second bool
		want          footprint.Grade
	}{
		"both measured":    {true, true, footprint.Averaged},
		"first estimated":  {false, true, footprint.Estimated},
		"second estimated": {true, false, footprint.Estimated},
	} {
		t.Run(name, func(t *testing.T) {
			r := open(t).used(0, hour, 1, c.first).used(hour, 2*hour, 2, c.second).close(2*hour).run(plain(flat(400)), method)
			assert.Equal(t, c.want, r.Grade)
			assert.InEpsilon(t, 3, value(t, r.Measured), 1e-14)
		})
	}
}

// TestUsedEstimatesProveNothing: what an estimate says is spent is charged,
// but it is not proven: only measured energy passes a limit on its own.
func TestUsedEstimatesProveNothing(t *testing.T) {
	r := open(t).used(0, hour, 1, true).used(hour, 2*hour, 2, false).used(2*hour, 3*hour, 4, true).close(3*hour).
		run(plain(series(hour, 100, 200, 300)), method)
	assert.InEpsilon(t, 7, value(t, r.Facility), 1e-14)
	assert.InEpsilon(t, 1*100+2*200+4*300, value(t, r.Operational), 1e-13)
	assert.InEpsilon(t, 5, float64(r.Proven.Facility), 1e-14)
	assert.InEpsilon(t, 1*100+4*300, float64(r.Proven.Total), 1e-13)
}

// TestUsedGap: the time between totals is a gap like any other: bridged where
// short, filled with the mean where long.
func TestUsedGap(t *testing.T) {
	short := open(t).used(60, 1060, 1/3.6, true).used(1160, 2160, 3/3.6, true).close(2220).run(plain(flat(400)), method)
	// 1000 W and 3000 W, held over the edges and linear in between.
	assert.InEpsilon(t, (60*1000+1e6+100*2000+3e6+60*3000)/3.6e6, value(t, short.Measured), 1e-13)

	long := open(t).used(0, 1000, 1/3.6, true).used(2000, 3000, 3/3.6, true).close(4000).run(plain(flat(400)), method)
	assert.InEpsilon(t, 8e6/3.6e6, value(t, long.Measured), 1e-13)
	assert.InEpsilon(t, 0.5, value(t, long.Coverage), 1e-13)
	assert.Equal(t, footprint.Averaged, long.Grade, "a total is the lower grade than a gap")
}

// TestTwoAccounts: totals and meters in one part tell the same energy twice.
// The meters count, the totals do not, and the part is unproven.
func TestTwoAccounts(t *testing.T) {
	for name, write := range map[string]func(*sheet) *sheet{
		"totals last": func(s *sheet) *sheet { return s.powers(0, hour, 60, "m", 1000).used(0, hour, 5, true) },
		"totals first": func(s *sheet) *sheet {
			return s.used(0, hour, 5, true).energy(0, "m", 0, 0).energy(hour, "m", 3.6e6, 0)
		},
	} {
		t.Run(name, func(t *testing.T) {
			r := write(open(t)).close(hour).run(plain(flat(400)), method)
			assert.Equal(t, []string{"two accounts of one run: run.ndjson has used lines and lines of meters"}, reasons(r))
			assert.False(t, r.Refuted(), "what the meters measured is spent")
			assert.InEpsilon(t, 1, value(t, r.Measured), 1e-13)
		})
	}
}

// TestTwoAccountsInTwoParts is no contradiction: each part has one.
func TestTwoAccountsInTwoParts(t *testing.T) {
	a := open(t, part("a", 2)).powers(0, hour, 60, "m", 1000).close(hour).weigh(plain(flat(400)), method)
	b := open(t, part("b", 2)).used(0, hour, 5, true).close(hour).weigh(plain(flat(400)), method)
	r := footprint.Combine([]*footprint.Part{a, b}, method)
	assert.Empty(t, r.Doubts)
	assert.InEpsilon(t, 6, value(t, r.Measured), 1e-13)
	assert.Equal(t, footprint.Averaged, r.Grade, "the worst of the parts")
}

// TestUsedOverlap: overlapping totals are an error of the record; the second
// does not count.
func TestUsedOverlap(t *testing.T) {
	r := open(t).used(0, hour, 1, true).used(hour-1, 2*hour, 1, true).close(hour).run(plain(flat(400)), method)
	assert.Len(t, r.Doubts, 1)
	assert.Contains(t, reasons(r)[0], "run.ndjson:3")
	assert.InEpsilon(t, 1, value(t, r.Measured), 1e-14)
}
