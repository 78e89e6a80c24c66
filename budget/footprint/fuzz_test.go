package footprint_test

import (
	"encoding/json"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// FuzzWeigh: a record is written by the code under review. Whatever stands in
// it, its footprint can be told: figures are finite and not below zero.
func FuzzWeigh(f *testing.F) {
	const opens = `{"k":"open","format":1,"run":"r1","job":"retrain-tide","at":"2031-03-04T02:00:00Z","site":"quay-north","machine":"quad"}` + "\n"
	for _, seed := range []string{
		"", opens,
		opens + `{"k":"power","at":"2031-03-04T02:00:00Z","meter":"a","w":412.5}` + "\n" + `{"k":"power","at":"2031-03-04T03:30:00Z","meter":"a","w":1e308}` + "\n",
		opens + `{"k":"power","at":"2031-03-04T02:00:00Z","meter":"a","w":1e308}` + "\n" + `{"k":"power","at":"2031-03-04T02:01:00Z","meter":"a","w":1e308}` + "\n",
		opens + `{"k":"energy","at":"2031-03-04T02:00:00Z","meter":"a","j":9e307,"wrap_j":1e308}` + "\n" + `{"k":"energy","at":"2031-03-04T02:00:00.000000001Z","meter":"a","j":1}` + "\n",
		opens + `{"k":"used","from":"2031-03-04T02:00:00Z","to":"2031-03-04T02:00:00.000000001Z","kwh":1e308,"how":"measured"}` + "\n",
		opens + `{"k":"power","at":"2031-03-04T02:00:00Z","meter":"a","w":1}` + "\n" + `{"k":"work","at":"2031-03-04T02:01:00Z","unit":"step","done":5e-324,"planned":1e308}` + "\n",
		opens + `{"k":"power","at":"2031-03-04T02:00:00Z","meter":"a","w":5e-324}` + "\n" + `{"k":"close","at":"2031-03-04T02:01:00Z","outcome":"ok"}` + "\n",
		strings.Replace(opens, `"quad"`, `"quad","reserved":1e308`, 1) + `{"k":"power","at":"2031-03-04T02:01:00Z","meter":"a","w":1}` + "\n",
	} {
		f.Add([]byte(seed))
	}
	facts := oldMachine()
	facts.Machine.Meters = 4
	facts.Machine.Rated, facts.Machine.Idle, facts.Site.Market = ptr(unit.Power(2800)), ptr(unit.Power(240)), ptr(unit.Intensity(305))
	m := certain(declared)
	f.Fuzz(func(t *testing.T, text []byte) {
		p := weighText(t, text, facts, m)
		if !p.Opened() {
			assert.NotZero(t, p.Findings.Len())
			return
		}
		r := footprint.Combine([]*footprint.Part{p, p}, m)
		_, err := json.Marshal(r)
		require.NoError(t, err, "no figure is infinite")
		_, err = json.Marshal(r.Doubts)
		require.NoError(t, err, "nor what a doubt is about")
		for _, v := range []*unit.Energy{r.Measured, r.MachineKWh, r.Facility, &r.Proven.Facility} {
			assert.True(t, v == nil || *v >= 0)
		}
		for _, v := range []*unit.Mass{r.Operational, r.Embodied, r.Total, r.Expanded, &r.Proven.Total} {
			assert.True(t, v == nil || *v >= 0)
		}
		if r.Coverage != nil {
			assert.LessOrEqual(t, float64(*r.Coverage), 1.0)
		}
		if r.Facility != nil {
			assert.InDelta(t, float64(*r.Facility), sum(r.Hours), 1e-9*float64(*r.Facility))
			assert.LessOrEqual(t, float64(r.Proven.Facility), float64(*r.Facility)*(1+tight))
		}
	})
}
