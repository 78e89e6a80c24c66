package budget_test

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/finding"
)

// applied tells whether the budget of plain ruled on the case.
func applied(s *budget.Statement) bool {
	for _, r := range s.Rulings {
		if r.Kind == budget.KindBudget {
			return true
		}
	}
	return false
}

func TestBranchGlobs(t *testing.T) {
	cases := []struct {
		glob, branch string
		applies      bool
	}{
		{"main", "main", true},
		{"main", "main-2", false},
		{"main", "Main", false},
		{"**", "main", true},
		{"**", "feature/gauge/tide", true},
		{"*", "feature/gauge", false},
		{"feature/*", "feature/gauge", true},
		{"feature/*", "feature/gauge/tide", false},
		{"feature/**", "feature/gauge/tide", true},
		{"**/tide", "feature/gauge/tide", true},
		{"{main,release/**}", "release/7/tide", true},
		{"release/[0-9]", "release/7", true},
		{"release/[0-9]", "release/x", false},
		{"release/?", "release/x", true},
	}
	for _, c := range cases {
		s := sceneOf(night())
		s.policy = edit(t, plain, `branch = "main"`, `branch = "`+c.glob+`"`)
		s.about.Branch = c.branch
		assert.Equal(t, c.applies, applied(s.judge(t)), "%s on %s", c.glob, c.branch)
	}
}

func TestJobAndStageGlobs(t *testing.T) {
	cases := []struct {
		job, stage, ofJob, ofStage string
		applies                    bool
	}{
		{"retrain-tide", "**", "retrain-tide", "training", true},
		{"retrain-*", "train*", "retrain-tide", "training", true},
		{"score-tide", "**", "retrain-tide", "training", false},
		{"**", "evaluation", "retrain-tide", "training", false},
		{"tide/**", "**", "tide/north/score", "training", true},
		{"tide/*", "**", "tide/north/score", "training", false},
		{"**", "**", "retrain-tide", "", true},
		{"**", "*", "retrain-tide", "", true},
		{"**", "training", "retrain-tide", "", false},
	}
	for _, c := range cases {
		s := sceneOf(night(func(s *sketch) { s.open.Job, s.open.Stage = c.ofJob, c.ofStage }))
		s.policy = edit(t, plain, "stage = \"training\"\nrequired = true\n", "", `name = "retrain-tide"`, `name = "`+c.ofJob+`"`,
			`job = "retrain-tide"`, `job = "`+c.job+"\"\nstage = \""+c.stage+`"`)
		assert.Equal(t, c.applies, applied(s.judge(t)), "%+v", c)
	}
}

// All matching rules apply, each with its own line.
func TestEveryMatchingRule(t *testing.T) {
	s := sceneOf(night())
	s.policy = plain + `
[[budget]]
name = "any branch"
branch = "*"
limit = "90 g"
per = "run"

[[budget]]
name = "releases"
branch = "release/**"
limit = "1 g"
per = "run"

[[budget]]
name = "any job"
limit = "2 kWh"
per = "run"
`
	st := s.judge(t)
	for name, state := range map[string]budget.State{"one training": budget.Within, "any branch": budget.Over, "any job": budget.Within} {
		r := ruling(t, st, name)
		assert.Equal(t, state, r.State, name)
		assert.Equal(t, lineOf(t, s.policy, `name = "`+name)-1, r.PolicyLine, name)
		assert.Equal(t, []any{"budgetcheck.toml", "main", "retrain-tide", "run"}, []any{r.PolicyFile, r.Branch, r.Job, r.Per}, name)
	}
	for _, r := range st.Rulings {
		assert.NotEqual(t, "releases", r.Name)
	}
	assert.Equal(t, budget.Closed, st.Gate)
	assert.Equal(t, budget.Over, st.Rulings[0].State, "the worst comes first")
}

// Where no rule is about the branch, nothing is asked of its evidence.
func TestNoRuleForBranch(t *testing.T) {
	broken := night(func(s *sketch) { s.lines = []string{"{"}; s.outcome = "" })
	for _, head := range [][]sketch{nil, {night()}, {broken}, {night(called("a", "r1")), night(called("b", "r2"))}} {
		s := sceneOf(head...)
		s.about.Branch = "feature/gauge"
		s.about.Unread = []finding.Finding{{File: "x.ndjson", What: "gone"}}
		st := s.judge(t)
		assert.Equal(t, budget.Open, st.Gate)
		assert.Equal(t, "no rule of budgetcheck.toml applies to branch feature/gauge", st.Reason)
		assert.Empty(t, st.Rulings)
		assert.Empty(t, st.Accounts)
		assert.Len(t, st.Runs, len(head), "what is given is shown")
	}
}

// A regression rule is a rule too: a branch that only it is about is not open
// for want of rules.
func TestRegressionAlone(t *testing.T) {
	s := sceneOf(night())
	s.policy = edit(t, plain, `branch = "main"`, `branch = "other"`) + "\n[[regression]]\nname = \"no creep\"\nbranch = \"main\"\nmax_rise = \"5%\"\n"
	st := s.judge(t)
	require.Equal(t, budget.Closed, st.Gate)
	r := ruling(t, st, "no creep")
	assert.Equal(t, []any{budget.KindRegression, budget.Unproven, lineOf(t, s.policy, "[[regression]]")}, []any{r.Kind, r.State, r.PolicyLine})
	assert.Equal(t, "3 base runs are needed to know their noise; there are 0", r.Reason)
}
