package footprint_test

import (
	"encoding/json"
	"errors"
	"io"
	"testing"
	"testing/iotest"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// keys are the keys of the run's JSON.
func keys(t *testing.T, r *footprint.Run) map[string]json.RawMessage {
	text, err := json.Marshal(r)
	require.NoError(t, err)
	var all map[string]json.RawMessage
	require.NoError(t, json.Unmarshal(text, &all))
	return all
}

// TestUnknownIsAbsent: what cannot be known for want of a site or a machine is
// absent, in the run and in its JSON, and never zero.
func TestUnknownIsAbsent(t *testing.T) {
	whole := func() footprint.Facts {
		f := oldMachine()
		f.Site.Market = ptr(unit.Intensity(305))
		return f
	}
	mass := []string{"operational_g", "total_g", "expanded_g", "intensity_g_per_kwh", "rate_g_per_unit", "priced"}
	m := method
	m.Uncertainty = declared
	for name, c := range map[string]struct {
		edit   func(*footprint.Facts)
		absent []string
		there  []string
	}{
		"all known":           {func(*footprint.Facts) {}, nil, append(mass, "measured_kwh", "machine_kwh", "facility_kwh", "embodied_g", "market_g")},
		"no site":             {func(f *footprint.Facts) { f.Site = nil }, append(mass, "facility_kwh", "market_g"), []string{"measured_kwh", "machine_kwh", "embodied_g"}},
		"no machine":          {func(f *footprint.Facts) { f.Machine = nil }, append(mass, "machine_kwh", "facility_kwh", "embodied_g", "market_g"), []string{"measured_kwh"}},
		"neither":             {func(f *footprint.Facts) { *f = footprint.Facts{} }, append(mass, "machine_kwh", "facility_kwh", "embodied_g", "market_g"), []string{"measured_kwh"}},
		"no intensity":        {func(f *footprint.Facts) { f.Site.Series = nil }, mass[:5], []string{"measured_kwh", "facility_kwh", "embodied_g", "market_g"}},
		"no embodied, market": {func(f *footprint.Facts) { f.Machine.Embodied, f.Site.Market = nil, nil }, []string{"embodied_g", "market_g"}, mass},
	} {
		t.Run(name, func(t *testing.T) {
			f := whole()
			c.edit(&f)
			r := open(t).powers(0, hour, 60, "m", 1000).work(hour, steps(10)).close(hour).run(f, m)
			got := keys(t, r)
			for _, key := range c.absent {
				assert.NotContains(t, got, key)
			}
			for _, key := range c.there {
				assert.Contains(t, got, key)
			}
		})
	}
}

// TestUnknownPartHidesAll: one part of unknown site or machine leaves the
// run's sums unknown; the other part is spent all the same.
func TestUnknownPartHidesAll(t *testing.T) {
	known := open(t, part("a", 2)).powers(0, hour, 60, "m", 1000).close(hour).weigh(oldMachine(), method)
	for name, f := range map[string]footprint.Facts{
		"site":    {Machine: oldMachine().Machine},
		"machine": {Site: oldMachine().Site},
	} {
		t.Run(name, func(t *testing.T) {
			other := open(t, part("b", 2)).powers(0, hour, 60, "n", 1000).close(hour).weigh(f, method)
			for _, parts := range [][]*footprint.Part{{known, other}, {other, known}} {
				r := footprint.Combine(parts, method)
				assert.Nil(t, r.Facility)
				assert.Nil(t, r.Total)
				assert.InEpsilon(t, 2, value(t, r.Measured), 1e-12)
				assert.InEpsilon(t, 1, float64(r.Proven.Facility), 1e-12)
				assert.GreaterOrEqual(t, float64(r.Proven.Total), 400*(1-1e-12))
			}
		})
	}
}

// TestNoEnergy: a record without a line of energy is no run of zero energy.
func TestNoEnergy(t *testing.T) {
	r := open(t).work(hour, steps(10)).close(hour).run(oldMachine(), method)
	got := keys(t, r)
	for _, key := range []string{"measured_kwh", "machine_kwh", "facility_kwh", "operational_g", "embodied_g", "total_g", "coverage", "grade", "rate_g_per_unit"} {
		assert.NotContains(t, got, key)
	}
	assert.Equal(t, []string{"no energy: run.ndjson has no power, energy or used lines"}, reasons(r))
	assert.Empty(t, r.Pieces[0].Digest, "nothing is no copy of nothing")
}

// TestEmptyRecord: without an open line there is no run to speak of.
func TestEmptyRecord(t *testing.T) {
	p := weighText(t, nil, plain(nil), method)
	assert.False(t, p.Opened())
	assert.Equal(t, 1, p.Findings.Len())
}

// TestFailureToRead is an error, not a thin record.
func TestFailureToRead(t *testing.T) {
	wet := errors.New("the disk is wet")
	s := open(t).powers(0, hour, 60, "m", 1000)
	r, err := record.NewReader(io.MultiReader(&s.text, iotest.ErrReader(wet)), "run.ndjson")
	require.NoError(t, err)
	_, err = footprint.Weigh(r, method, func(*record.Open) footprint.Facts { return plain(nil) })
	require.ErrorIs(t, err, wet)
	assert.ErrorContains(t, err, "run.ndjson")
}

// TestBadLineIsDoubt: the lines around it count, and the doubt names it.
func TestBadLineIsDoubt(t *testing.T) {
	s := open(t).powers(0, hour, 60, "m", 1000)
	s.text.WriteString(`{"k":"power","at":"2031-03-04T03:00:30Z","meter":"m","w":-1}` + "\n")
	r := s.powers(hour+60, 2*hour, 60, "m", 1000).close(2*hour).run(plain(flat(400)), method)
	assert.InEpsilon(t, 800, value(t, r.Operational), 1e-12)
	require.Len(t, r.Doubts, 1)
	assert.Contains(t, r.Doubts[0].Reason, "run.ndjson:63: ")
	assert.False(t, r.Known())
}
