package budget_test

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// What is proven to be spent is spent, however thin the rest. Each case proves
// 100 g or 1 kWh of a run that may have spent more.
func TestProvenPart(t *testing.T) {
	long := func(s *sketch) { s.length = 2 * unit.Hour }
	thin := map[string]*scene{
		"half of it not read":   sceneOf(night(long, func(s *sketch) { s.hole = [2]unit.Duration{unit.Hour, 2 * unit.Hour} })),
		"half of it not priced": sceneOf(night(long)),
		"a part missing":        sceneOf(night(part("1"), scaled(2))),
		"an attempt missing":    sceneOf(attempt(2, record.OK)),
		"a line that is wrong":  sceneOf(night(func(s *sketch) { s.lines = []string{"{}"} })),
		"too old":               sceneOf(night()),
		"a pilot":               sceneOf(night(func(s *sketch) { s.work[0].Planned = 5000 })),
		"no work":               sceneOf(night(work())),
		"a meter missing":       sceneOf(night(meters(3), scaled(4./3))),
		"a foreign site":        sceneOf(night()),
		"not required":          sceneOf(night(func(s *sketch) { s.outcome = record.Failed })),
	}
	thin["half of it not priced"].series = header + row(-60, 60, "100") + row(200, 300, "100")
	thin["too old"].about.Now = two.Add(30 * unit.Day)
	thin["no work"].policy = edit(t, plain, "required = true\n", "required = true\nwork = \"10 step\"\n")
	thin["a foreign site"].policy = edit(t, plain, "required = true\n", "required = true\nsites = [\"quay-south\"]\n")
	for name, s := range thin {
		t.Run(name, func(t *testing.T) {
			policy := s.policy
			for limit, want := range map[string]budget.State{"90 g": budget.Over, "0.9 kWh": budget.Over, "101 g": budget.Unproven, "5 kg": budget.Unproven} {
				s.policy = edit(t, policy, `"150 g"`, `"`+limit+`"`)
				st := s.judge(t)
				assert.Equal(t, want, ruling(t, st, "one training").State, limit)
				assert.NotEmpty(t, doubts(st), "the doubt is told all the same")
				assert.Equal(t, budget.Closed, st.Gate)
			}
		})
	}
}

// Filled gaps and unpriced hours are no proof.
func TestProvenIsShown(t *testing.T) {
	s := sceneOf(night(func(s *sketch) { s.length, s.hole = 2*unit.Hour, [2]unit.Duration{unit.Hour, 2 * unit.Hour} }))
	s.policy = edit(t, plain, `"150 g"`, `"90 g"`)
	r := ruling(t, s.judge(t), "one training")
	assert.Equal(t, "the measured, priced part alone passes the limit", r.Reason)
	assert.InDelta(t, 100, *r.Observed, 1e-9, "not the 200 g that it may have been")
	assert.Equal(t, []string{"100 g", "90.0 g", "10.0 g"}, []string{r.ObservedText, r.LimitText, r.ExcessText})
}

func TestOverBeatsUnproven(t *testing.T) {
	s := sceneOf(night(func(s *sketch) { s.lines = []string{"{}"} }))
	s.policy = plain + "\n[[budget]]\nname = \"tight\"\nbranch = \"main\"\nlimit = \"80 g\"\nper = \"run\"\n"
	st := s.judge(t)
	require.Equal(t, budget.Closed, st.Gate)
	assert.Equal(t, []budget.State{budget.Over, budget.Unproven, budget.Unproven}, []budget.State{st.Rulings[0].State, st.Rulings[1].State, st.Rulings[2].State})
	assert.Equal(t, "tight is over by 20.0 g: 100 g of 80.0 g (of 3 rulings 1 over, 2 unproven)", st.Reason)
	s.policy = edit(t, s.policy, `unproven = "close"`, `unproven = "warn"`)
	assert.Equal(t, budget.Closed, s.judge(t).Gate, "over closes whatever the policy says of unproven")
}

func TestUnprovenOnlyWarns(t *testing.T) {
	for _, s := range []*scene{sceneOf(), sceneOf(night(meters(3)))} {
		s.policy = edit(t, plain, `unproven = "close"`, `unproven = "warn"`)
		st := s.judge(t)
		assert.Equal(t, budget.Open, st.Gate)
		assert.Equal(t, budget.Unproven, ruling(t, st, "one training").State, "the state is no better for it")
		assert.True(t, strings.HasPrefix(st.Reason, "the policy only warns: unproven: "), st.Reason)
	}
}

// The worst of three states decides; near alone leaves the gate open.
func TestPrecedence(t *testing.T) {
	s := sceneOf(night())
	rule := func(name, limit string) string {
		return "\n[[budget]]\nname = \"" + name + "\"\nlimit = \"" + limit + "\"\nper = \"run\"\nwarn_at = 0.5\n"
	}
	s.policy = plain + rule("close by", "110 g")
	st := s.judge(t)
	assert.Equal(t, []any{budget.Open, budget.Near, "of 3 rulings 1 near, 2 within"}, []any{st.Gate, st.Rulings[0].State, st.Reason})
	s.policy += rule("passed", "99 g")
	st = s.judge(t)
	assert.Equal(t, []any{budget.Closed, budget.Over, budget.Near}, []any{st.Gate, st.Rulings[0].State, st.Rulings[1].State})
}
