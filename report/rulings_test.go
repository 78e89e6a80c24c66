package report

import (
	"math"
	"testing"

	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/unit"
)

// A probability is rounded, but never to a certainty that is not there.
func TestConformance(t *testing.T) {
	for p, want := range map[float64]string{0.5: "50.0 %", 0.2272: "22.7 %", 0.999: "99.9 %", math.Nextafter(0.999, 1): "above 99.9 %", 1: "above 99.9 %",
		0.001: "0.100 %", math.Nextafter(0.001, 0): "below 0.100 %", 0: "below 0.100 %"} {
		require.Equal(t, want, conformance(budget.Ruling{Conformance: &p}).text, "%v", p)
	}
	require.Equal(t, none, conformance(budget.Ruling{}))
}

func TestPolicyLineNamesTheFileAmongSeveral(t *testing.T) {
	r := budget.Ruling{PolicyFile: "harbour.toml", PolicyLine: 7}
	require.Equal(t, "7", policyLine(r, &budget.Statement{PolicySource: "harbour.toml"}).text)
	require.Equal(t, foreign("harbour.toml:7"), policyLine(r, &budget.Statement{PolicySource: "harbour.toml and tide.toml"}))
	require.Equal(t, none, policyLine(budget.Ruling{}, &budget.Statement{PolicySource: "harbour.toml"}))
}

func TestObservedWithItsInterval(t *testing.T) {
	for want, r := range map[string]budget.Ruling{
		"":                                {},
		"2.37 kg":                         {ObservedText: "2.37 kg"},
		"2.37 ± 0.46 kg":                  {ObservedText: "2.37 kg", IntervalText: "2.37 ± 0.46 kg"},
		"2.3722 kg (2.37 ± 0.46 kg)":      {ObservedText: "2.3722 kg", IntervalText: "2.37 ± 0.46 kg"},
		"980 g (0.98 ± 1.20 kg)":          {ObservedText: "980 g", IntervalText: "0.98 ± 1.20 kg"},
		"23.7 ± 4.6 g per 1000 step":      {ObservedText: "23.7 g per 1000 step", IntervalText: "23.7 ± 4.6 g per 1000 step"},
		"2.3 kg of 2 (2.37 ± 0.46 kg)":    {ObservedText: "2.3 kg of 2", IntervalText: "2.37 ± 0.46 kg"},
		"2.37 kg a | b (2.38 ± 0.4 kg a)": {ObservedText: "2.37 kg a | b", IntervalText: "2.38 ± 0.4 kg a"},
	} {
		require.Equal(t, want, observedText(r))
	}
}

func TestPage(t *testing.T) {
	low, high := unit.Mass(1900), unit.Mass(2090)
	carried := unit.Mass(2372)
	lines := []budget.PageLine{
		{Job: "retrain-tide", Stage: "training", Runs: 6, Each: 1980, Low: &low, High: &high},
		{Job: "retrain-tide", Stage: "training", Head: true, Runs: 1, Each: 2372},
		{Job: "潮", Head: true, Runs: 1, Each: 20},
	}
	account := budget.AccountLine{Name: "one run", Per: "run", Limit: 2200, Carried: &carried, State: budget.Over, Page: lines}
	want := []string{
		"  one run: 2.20 kg for each run",
		"- retrain-tide, training  6 runs at 1.98 kg each, from 1.90 kg to 2.09 kg",
		"+ retrain-tide, training  1 run  at 2.37 kg",
		"+ 潮                       1 run  at 20.0 g",
	}
	require.Equal(t, append(want, "! over the limit by 172 g"), page(account))
	account.State = budget.Near
	require.Equal(t, want, page(account))
	account.State, account.Carried = budget.Unproven, nil
	require.Equal(t, append(want, "! unproven, see the rulings"), page(account))
}

// Long names do not push everybody else's figures out of sight.
func TestColumnsHaveAnEnd(t *testing.T) {
	long := string(make([]rune, 300))
	got := aligned([][]string{{"a", "b"}, {long, "b"}}, func(int) bool { return false })
	require.Len(t, got[0], widest+len("  b"))
}

func TestEmptyColumnsAreLeftOut(t *testing.T) {
	tb := table{head: []string{"a", "b", "c"}, rows: [][]cell{{own("1"), none, none}, {own("2"), none, own("3")}}}
	require.Equal(t, table{head: []string{"a", "c"}, rows: [][]cell{{own("1"), none}, {own("2"), own("3")}}}, tb.slim())
	tb.rows = [][]cell{{foreign("-"), none, none}}
	require.Equal(t, []string{"a"}, tb.slim().head, "a name that looks like nothing is something")
}
