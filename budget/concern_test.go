package budget_test

import (
	"testing"

	"github.com/stretchr/testify/assert"

	"budgetcheck/budget"
	"budgetcheck/budget/unit"
)

// An energy does not turn on what a kilowatt-hour is charged with: where only
// the intensity is missing, a limit on energy is judged all the same.
func TestEnergyNeedsNoPrice(t *testing.T) {
	s := sceneOf(night(func(s *sketch) { s.length = 2 * unit.Hour }))
	s.series = header + row(-60, 60, "100") + row(200, 300, "100")
	for limit, want := range map[string]budget.State{"2.5 kWh": budget.Within, "1.5 kWh": budget.Over, "5 kg": budget.Unproven} {
		s.policy = edit(t, plain, `"150 g"`, `"`+limit+`"`)
		st := s.judge(t)
		assert.Equal(t, want, ruling(t, st, "one training").State, limit)
		assert.Equal(t, budget.Closed, st.Gate, "the evidence itself is unproven")
	}
}

// While work is still to come, what a run has emitted per unit of it is no
// lower bound: the start-up is in it, the cheap rest is not.
func TestUnfinishedRateProvesNothing(t *testing.T) {
	pilot := sceneOf(night(func(s *sketch) { s.work[0].Planned = 5000 }))
	missing := sceneOf(night(part("1")))
	for _, s := range []*scene{pilot, missing} {
		s.policy = edit(t, plain, `"150 g"`, `"1 mg per step"`)
		assert.Equal(t, budget.Unproven, ruling(t, s.judge(t), "one training").State)
	}
	whole := sceneOf(night())
	whole.policy = edit(t, plain, `"150 g"`, `"1 mg per step"`)
	assert.Equal(t, budget.Over, ruling(t, whole.judge(t), "one training").State)
}
