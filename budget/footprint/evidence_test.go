package footprint_test

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/unit"
)

// TestMetersMissing: a part needs meters x reserved/units of them.
func TestMetersMissing(t *testing.T) {
	for name, c := range map[string]struct {
		declared int
		units    float64 // reserved; 0 is all four
		have     []string
		missing  bool
	}{
		"all of four":          {4, 0, []string{"a", "b", "c", "d"}, false},
		"three of four":        {4, 0, []string{"a", "b", "c"}, true},
		"more than there are":  {4, 0, []string{"a", "b", "c", "d", "e"}, false},
		"half the machine":     {4, 2, []string{"a", "b"}, false},
		"less than half":       {4, 2, []string{"a"}, true},
		"not said":             {0, 0, []string{"a"}, false},
		"five for all, a part": {5, 1, []string{"a"}, true}, // 1.25 are asked for
	} {
		t.Run(name, func(t *testing.T) {
			f := plain(flat(400))
			f.Machine.Meters = c.declared
			s := open(t, reserved(c.units))
			for _, m := range c.have {
				s.powers(0, hour, 60, m, 100)
			}
			r := s.close(hour).run(f, method)
			if !c.missing {
				assert.Empty(t, r.Doubts)
				return
			}
			require.Len(t, r.Doubts, 1)
			assert.Contains(t, r.Doubts[0].Reason, "meter missing")
			assert.InDelta(t, len(c.have), r.Doubts[0].Observed, 0)
			assert.Greater(t, r.Doubts[0].Limit, r.Doubts[0].Observed)
			assert.False(t, r.Refuted(), "what the others measured is spent")
		})
	}
}

// TestMetersOfUsed: a total is of no meter. Where the machine has meters, they
// are missing; else one used line could stand in for all of them.
func TestMetersOfUsed(t *testing.T) {
	f := plain(flat(400))
	assert.Empty(t, open(t).used(0, hour, 1, true).close(hour).run(f, method).Doubts)
	f.Machine.Meters = 4
	doubts := open(t).used(0, hour, 1, true).close(hour).run(f, method).Doubts
	require.Len(t, doubts, 1)
	assert.Contains(t, doubts[0].Reason, "meter missing: run.ndjson has 0 of the 4 meters")
}

// TestMetersOfOddMachines: shares of units that no float holds exactly ask for
// no more meters than there are.
func TestMetersOfOddMachines(t *testing.T) {
	for units := 1.0; units <= 26; units++ {
		for held := 1.0; held <= units; held++ {
			f := plain(flat(400))
			f.Machine.Units, f.Machine.Meters = units, int(units)
			s := open(t, reserved(held))
			for m := range int(held) {
				s.power(0, string(rune('A'+m)), 100)
			}
			require.Empty(t, s.close(60).run(f, method).Doubts, "%v of %v units", held, units)
		}
	}
}

// TestRated: a reading above rated x measured_share x reserved/units is not
// plausible, and puts the measured energy itself in question.
func TestRated(t *testing.T) {
	const limit = 2800 * 0.75 * 2 / 4
	for name, c := range map[string]struct {
		write func(*sheet) *sheet
		line  string // of the first reading above it
	}{
		"power at it":   {func(s *sheet) *sheet { return s.powers(0, 120, 60, "m", limit) }, ""},
		"power above":   {func(s *sheet) *sheet { return s.power(0, "m", 100).power(60, "m", limit+1).power(120, "m", limit+2) }, "run.ndjson:3: "},
		"counter at it": {func(s *sheet) *sheet { return s.energy(0, "m", 0, 0).energy(120, "m", 120*limit, 0) }, ""},
		"counter above": {func(s *sheet) *sheet { return s.energy(0, "m", 0, 0).energy(120, "m", 120*(limit+1), 0) }, "run.ndjson:3: "},
		"total at it":   {func(s *sheet) *sheet { return s.used(0, 120, limit*120/3.6e6, true) }, ""},
		"total above":   {func(s *sheet) *sheet { return s.used(0, 120, (limit+1)*120/3.6e6, true) }, "run.ndjson:2: "},
	} {
		t.Run(name, func(t *testing.T) {
			f := plain(flat(400))
			f.Machine.Rated, f.Machine.MeasuredShare = ptr(unit.Power(2800)), 0.75
			r := c.write(open(t, reserved(2))).close(120).run(f, method)
			assert.Equal(t, c.line != "", r.Refuted())
			if c.line == "" {
				assert.Empty(t, r.Doubts)
				return
			}
			require.Len(t, r.Doubts, 1)
			assert.Contains(t, r.Doubts[0].Reason, c.line)
			assert.InEpsilon(t, limit+1, r.Doubts[0].Observed, 1e-12)
			assert.InEpsilon(t, limit, r.Doubts[0].Limit, 1e-14)
			assert.Equal(t, "W", r.Doubts[0].Unit)
		})
	}
}
