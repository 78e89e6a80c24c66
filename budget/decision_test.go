package budget_test

import (
	"fmt"
	"math"
	"strconv"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/unit"
)

// exact writes a value in base units so that reading it gives the same float.
func exact(v float64, in string) string { return strconv.FormatFloat(v, 'g', -1, 64) + " " + in }

// againstLimit judges a run of 100 g and 1 kWh against a limit.
func againstLimit(t *testing.T, limit string, pairs ...string) budget.Ruling {
	t.Helper()
	s := sceneOf(night())
	s.policy = edit(t, plain, append([]string{`limit = "150 g"`, `limit = "` + limit + `"`}, pairs...)...)
	st := s.judge(t)
	require.Empty(t, doubts(st))
	return ruling(t, st, "one training")
}

// A standard uncertainty of 10 %, so that y = 100 and u = 10.
var declared = []string{`decision = "simple"`, "decision = \"guarded\"\nuncertainty = { intensity = \"10%\" }"}

// Outcomes of JCGM 106:2012 and ILAC-G8:09/2019 for an upper limit L, with the
// guard band of the expanded uncertainty U = 2u = 20.
func TestDecisionRules(t *testing.T) {
	cases := []struct {
		limit           float64
		simple, guarded budget.State
	}{
		{150, budget.Within, budget.Within},
		{120, budget.Within, budget.Within}, // y + U = L
		{math.Nextafter(120, 0), budget.Within, budget.Near},
		{110, budget.Within, budget.Near},
		{100, budget.Within, budget.Near}, // y = L
		{math.Nextafter(100, 0), budget.Over, budget.Unproven},
		{90, budget.Over, budget.Unproven},
		{80, budget.Over, budget.Unproven}, // y - U = L
		{math.Nextafter(80, 0), budget.Over, budget.Over},
		{0, budget.Over, budget.Over},
	}
	for _, c := range cases {
		limit := exact(c.limit, "g")
		assert.Equal(t, c.simple, againstLimit(t, limit).State, "simple, %s", limit)
		r := againstLimit(t, limit, declared...)
		assert.Equal(t, c.guarded, r.State, "guarded, %s", limit)
		if c.guarded == budget.Unproven {
			assert.Contains(t, r.Reason, "by less than its expanded uncertainty", "what is unproven says why")
		}
	}
}

// Phi((L - y)/u), JCGM 106:2012. The factors 1.6448... and 2 and their
// probabilities are those of the standard normal distribution.
func TestConformance(t *testing.T) {
	const y, u = 100, 10
	cases := []struct{ limit, want float64 }{
		{y + 2*u, 0.9772498680518208},
		{y + 1.6448536269514722*u, 0.95},
		{y + 1*u, 0.8413447460685429},
		{y, 0.5},
		{y - 1.6448536269514722*u, 0.05},
	}
	for _, c := range cases {
		for _, rule := range []string{"guarded", "simple"} { // shown under both
			r := againstLimit(t, exact(c.limit, "g"), declared[0], edit(t, declared[1], "guarded", rule))
			require.NotNil(t, r.Conformance)
			assert.InDelta(t, c.want, *r.Conformance, 1e-12, "%s, limit %v", rule, c.limit)
		}
	}
	assert.Nil(t, againstLimit(t, "110 g").Conformance, "nothing is declared")
}

// Exactly at the limit is within, its floating-point neighbour below is not.
func TestExactlyAtTheLimit(t *testing.T) {
	for _, c := range []struct {
		value float64
		unit  string
	}{{100, "g"}, {1, "kWh"}} {
		for limit, want := range map[float64]budget.State{
			c.value: budget.Within, math.Nextafter(c.value, 1e9): budget.Within, math.Nextafter(c.value, 0): budget.Over} {
			r := againstLimit(t, exact(limit, c.unit))
			assert.Equal(t, want, r.State, "%v against %v %s", c.value, limit, c.unit)
			assert.Equal(t, []any{c.value, limit, c.unit}, []any{*r.Observed, *r.Limit, r.Unit})
			if limit != c.value {
				assert.NotEqual(t, r.ObservedText, r.LimitText, "people see the difference")
			}
		}
	}
	for limit, want := range map[string]budget.State{"0.1 kg": budget.Within, "0.0001 t": budget.Within, "3.6 MJ": budget.Within, "1000 Wh": budget.Within, "99.9999 g": budget.Over} {
		assert.Equal(t, want, againstLimit(t, limit).State, limit)
	}
}

// n g for 10000 steps is exactly n/10 g per 1000 steps, for all n. Brought to
// one step both would be rounded, and for 41 g they would not be the same.
func TestExactlyAtTheRate(t *testing.T) {
	for n := 1; n <= 120; n++ {
		s := sceneOf(night(func(s *sketch) { s.every, s.work[0].Done = unit.Hour, 10000 }))
		s.series = edit(t, steady, "100,average", fmt.Sprintf("%d,average", n))
		for below, want := range map[bool]budget.State{false: budget.Within, true: budget.Over} {
			limit := float64(n) / 10
			if below {
				limit = math.Nextafter(limit, 0)
			}
			s.policy = edit(t, plain, `limit = "150 g"`, `limit = "`+exact(limit, "g per 1000 step")+`"`, "[evidence]\n", "[evidence]\nmax_gap = \"1h\"\n")
			r := ruling(t, s.judge(t), "one training")
			assert.Equal(t, want, r.State, "%d g against %v g per 1000 step", n, limit)
			assert.Equal(t, "g/step", r.Unit)
			assert.InEpsilon(t, float64(n)/10000, *r.Observed, 1e-15, "told for one step")
			assert.InEpsilon(t, limit/1000, *r.Limit, 1e-15)
		}
	}
}

// A passed warn_at makes within near; exactly at it does not.
func TestWarnAt(t *testing.T) {
	cases := []struct {
		limit, warn string
		want        budget.State
	}{
		{"125 g", "0.8", budget.Within},
		{"125 g", "0.7999999999999999", budget.Near},
		{"125 g", "0.8000000000000002", budget.Within},
		{"124 g", "0.8", budget.Near},
		{"100 g", "1.0", budget.Within},
		{"99 g", "0.8", budget.Over},
		{"1.25 kWh", `"80 %"`, budget.Within},
		{"1.2 kWh", `"80 %"`, budget.Near},
		{"125 g per 1000 step", "0.8", budget.Within},
		{"124 g per 1000 step", "0.8", budget.Near},
	}
	for _, c := range cases {
		r := againstLimit(t, c.limit, "per = \"run\"\n", "per = \"run\"\nwarn_at = "+c.warn+"\n")
		assert.Equal(t, c.want, r.State, "%s at %s", c.limit, c.warn)
	}
	r := againstLimit(t, "150 g", append([]string{"per = \"run\"\n", "per = \"run\"\nwarn_at = 0.6\n"}, declared...)...)
	assert.Equal(t, budget.Near, r.State, "guarded too")
}

// Exactly at warn_at, n g of 100 g, for all n: a share of the limit would be
// rounded, and 0.29 of 100 g lies below 29 g.
func TestExactlyAtWarnAt(t *testing.T) {
	for n := 1; n < 100; n++ {
		s := sceneOf(night(func(s *sketch) { s.every = unit.Hour }))
		s.series = edit(t, steady, "100,average", fmt.Sprintf("%d,average", n))
		s.policy = edit(t, plain, `"150 g"`, `"100 g"`, "[evidence]\n", "[evidence]\nmax_gap = \"1h\"\n", "per = \"run\"\n", fmt.Sprintf("per = \"run\"\nwarn_at = 0.%02d\n", n))
		assert.Equal(t, budget.Within, ruling(t, s.judge(t), "one training").State, "%d g", n)
	}
}

func TestZeroLimit(t *testing.T) {
	r := againstLimit(t, "0 g", "per = \"run\"\n", "per = \"run\"\nwarn_at = 0.5\n")
	assert.Equal(t, budget.Over, r.State)
	assert.Nil(t, r.Share, "there is no share of nothing")
	s := sceneOf(night())
	s.series = edit(t, steady, "100,average", "0,average")
	s.policy = edit(t, plain, `limit = "150 g"`, `limit = "0 g"`)
	assert.Equal(t, budget.Within, ruling(t, s.judge(t), "one training").State, "nothing is exactly nothing")
}
