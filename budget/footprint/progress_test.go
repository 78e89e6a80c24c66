package footprint_test

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// TestProgress: the energy by a work line is the integral up to its very time,
// over all meters, also where it lies between two samples.
func TestProgress(t *testing.T) {
	s := open(t)
	s.power(0, "a", 0).power(0, "b", 1000).work(15, steps(1)).power(30, "a", 3000).work(30, steps(2)).power(60, "a", 3000).power(60, "b", 1000)
	s.work(60, steps(3)).work(75, steps(4))
	p := s.close(75).weigh(plain(flat(400)), method)
	require.Len(t, p.Progress, 4)
	for n, joules := range []float64{1500.0*15/2 + 15000, 45000 + 30000, 135000 + 60000, 180000 + 75000} {
		assert.InEpsilon(t, joules, float64(p.Progress[n].KWh)*unit.JoulesPerKWh, 1e-12)
	}
	assert.Equal(t, 15*unit.Second, p.Progress[0].Elapsed)
	assert.EqualValues(t, 3, p.Progress[2].Done)
}

// TestProgressReachesTheWhole: by a last work line at the end all that was
// measured is counted, however meters, lines and gaps lie; it never falls.
func TestProgressReachesTheWhole(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d := drawRecord(t)
		p := d.sheet(t).weigh(facts(t, false), method)
		last := 0.0
		for _, step := range p.Progress {
			assert.GreaterOrEqual(t, float64(step.KWh), last*(1-1e-12))
			last = float64(step.KWh)
			assert.LessOrEqual(t, last, float64(p.MeasuredEnergy())*(1+1e-9))
		}
	})
}

// TestProgressOfManyLines keeps an even picture of a long run.
func TestProgressOfManyLines(t *testing.T) {
	s := open(t)
	const lines = 20000
	for n := range lines {
		s.power(float64(n), "a", 1000).work(float64(n), steps(float64(n)))
	}
	p := s.close(lines).weigh(plain(flat(400)), method)
	require.Less(t, len(p.Progress), 4097)
	require.Greater(t, len(p.Progress), 2000)
	for _, step := range p.Progress {
		assert.InDelta(t, step.Done*1000, float64(step.KWh)*unit.JoulesPerKWh, 1e-3)
	}
	few := footprint.Thinned(p.Progress, 66)
	assert.LessOrEqual(t, len(few), 66)
	assert.Greater(t, len(few), 60)
	assert.Equal(t, p.Progress[len(p.Progress)-1], few[len(few)-1])
}
