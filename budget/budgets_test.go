package budget_test

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// nights are runs of so many times the power, an hour after one another.
func nights(powers ...float64) (runs []sketch) {
	for n, by := range powers {
		id := string(rune('a' + n))
		runs = append(runs, night(called(id+".ndjson", id), scaled(by), later(unit.Duration(n)*unit.Hour)))
	}
	return runs
}

// With per = "run" each run has the limit to itself, and the worst is shown.
func TestWorstOfSeveralRuns(t *testing.T) {
	cases := []struct {
		powers   []float64
		state    budget.State
		observed float64
	}{
		{[]float64{0.5, 1.2, 0.9}, budget.Within, 120},
		{[]float64{0.5, 1.6, 1.7, 0.9}, budget.Over, 170},
		{[]float64{1.7, 0.5}, budget.Over, 170},
	}
	for _, c := range cases {
		st := sceneOf(nights(c.powers...)...).judge(t)
		r := ruling(t, st, "one training")
		assert.Equal(t, c.state, r.State)
		assert.InDelta(t, c.observed, *r.Observed, 1e-9)
		assert.Contains(t, r.Reason, "worst of ")
		require.Len(t, st.Accounts, 1)
		a := st.Accounts[0]
		assert.Equal(t, []any{"one training", "run", unit.Mass(150), *r.Observed, *r.Observed, (*unit.Mass)(nil), c.state},
			[]any{a.Name, a.Per, a.Limit, float64(*a.Change), float64(*a.Carried), a.Brought, a.State})
		require.Len(t, a.Page, 1)
		assert.Equal(t, []any{"retrain-tide", "training", true, len(c.powers)}, []any{a.Page[0].Job, a.Page[0].Stage, a.Page[0].Head, a.Page[0].Runs})
	}
	// An unproven small run is worse than a proven large one.
	runs := nights(0.5, 1.2)
	runs[0].lines = []string{"{}"}
	r := ruling(t, sceneOf(runs...).judge(t), "one training")
	assert.Equal(t, []any{budget.Unproven, 50.0}, []any{r.State, *r.Observed})
	assert.Contains(t, r.Reason, "worst of 2 runs; 1 lines of a.ndjson cannot count")
}

func TestEnergyLimit(t *testing.T) {
	for limit, want := range map[string]budget.State{"1 kWh": budget.Within, "999 Wh": budget.Over} {
		s := sceneOf(night())
		s.policy = edit(t, plain, `"150 g"`, `"`+limit+`"`)
		st := s.judge(t)
		r := ruling(t, st, "one training")
		assert.Equal(t, []any{want, 1.0, "kWh"}, []any{r.State, *r.Observed, r.Unit})
		assert.Empty(t, st.Accounts, "accounts are of emissions")
	}
	s := sceneOf(night())
	s.policy = edit(t, plain, `"150 g"`, `"1 kWh"`, "pue = 1.0\n\n[site.quay-south]", "pue = 1.25\n\n[site.quay-south]", "measured_share = 1.0", "measured_share = 0.5")
	r := ruling(t, s.judge(t), "one training")
	assert.Equal(t, []any{budget.Over, 2.5}, []any{r.State, *r.Observed}, "limits are of the facility's energy")
}

func TestRateLimit(t *testing.T) {
	judge := func(limit string, lines ...record.Work) budget.Ruling {
		s := sceneOf(night(work(lines...)))
		s.policy = edit(t, plain, `"150 g"`, `"`+limit+`"`)
		return ruling(t, s.judge(t), "one training")
	}
	steps := record.Work{Unit: "step", Done: 4000}
	r := judge("26 g per 1000 step", steps)
	assert.Equal(t, []any{budget.Within, 0.025, 0.026, "g/step"}, []any{r.State, *r.Observed, *r.Limit, r.Unit})
	assert.Equal(t, []string{"25.0 g per 1000 step", "26.0 g per 1000 step"}, []string{r.ObservedText, r.LimitText})
	r = judge("24 mg per step", steps)
	assert.Equal(t, []any{budget.Over, "25.0 mg per step", "1.00 mg per step"}, []any{r.State, r.ObservedText, r.ExcessText})

	unproven := map[string]budget.Ruling{
		"work of run n1 is told in step, the limit is per epoch": judge("30 g per epoch", steps),
		"run n1 has no work lines; the limit is per step":        judge("30 g per step"),
		"run n1 has done no work":                                judge("30 g per step", record.Work{Unit: "step"}),
	}
	for want, r := range unproven {
		assert.Equal(t, []any{budget.Unproven, want}, []any{r.State, r.Reason})
		assert.Nil(t, r.Observed)
	}
	assert.Equal(t, budget.Over, judge("1 mg per step", steps).State)
}

// A job that nobody requires need not have run.
func TestNothingToRuleOn(t *testing.T) {
	s := sceneOf(night())
	s.policy = plain + "\n[[job]]\nname = \"score-tide\"\n\n[[budget]]\nname = \"one scoring\"\njob = \"score-tide\"\nlimit = \"1 g\"\nper = \"run\"\n"
	st := s.judge(t)
	assert.Equal(t, budget.Open, st.Gate)
	for _, r := range st.Rulings {
		assert.NotEqual(t, "one scoring", r.Name)
	}
	s.policy = edit(t, s.policy, "name = \"score-tide\"\n", "name = \"score-tide\"\nrequired = true\n")
	r := ruling(t, s.judge(t), "one scoring")
	assert.Equal(t, []any{budget.Unproven, "score-tide", "job score-tide is required, and there is no head run of it"}, []any{r.State, r.Job, r.Reason})
}
