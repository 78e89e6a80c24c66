package budget_test

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/finding"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// A gate waits while further records may be all that it lacks.
func TestAwaits(t *testing.T) {
	for name, s := range map[string]*scene{
		"no record at all":     sceneOf(),
		"a part is missing":    sceneOf(night(part("1"))),
		"an attempt missing":   sceneOf(attempt(2, record.OK)),
		"another job's record": {policy: plain + secondJob, series: steady, head: []sketch{night()}, about: sceneOf().about},
	} {
		st := s.judge(t)
		assert.Equal(t, budget.Closed, st.Gate, name)
		assert.True(t, st.Awaits(), "%s: %v", name, doubts(st))
	}
}

const secondJob = "\n[[job]]\nname = \"score-tide\"\nstage = \"evaluation\"\nrequired = true\n"

// It does not wait where something is wrong that no record mends, even if
// records are missing as well.
func TestDoesNotAwait(t *testing.T) {
	broken := func(s *sketch) { s.lines = []string{"{}"} }
	both := func(s *scene) *scene { s.policy = plain + secondJob; return s }
	old := sceneOf(night(part("1")))
	old.about.Now = two.Add(30 * unit.Day)
	unread := sceneOf()
	unread.about.Unread = []finding.Finding{{File: "x.ndjson", What: "the file cannot be read"}}
	stray := sceneOf(sketch{file: "x.ndjson", raw: "{}\n"})
	for name, s := range map[string]*scene{
		"over":                         sceneOf(night(scaled(2))),
		"over, a part missing":         sceneOf(night(part("1"), scaled(4))),
		"over, another job missing":    both(sceneOf(night(scaled(2)))),
		"a bad line":                   sceneOf(night(broken)),
		"a bad line, a part missing":   sceneOf(night(part("1"), broken)),
		"a bad line, another missing":  both(sceneOf(night(broken))),
		"a meter missing":              sceneOf(night(meters(3))),
		"a failed run":                 sceneOf(night(func(s *sketch) { s.outcome = record.Failed })),
		"too old, a part missing":      old,
		"a file that cannot be opened": unread,
		"a record of no run":           stray,
	} {
		st := s.judge(t)
		assert.Equal(t, budget.Closed, st.Gate, name)
		assert.False(t, st.Awaits(), "%s: %+v", name, st.Rulings)
	}
	assert.False(t, sceneOf(night()).judge(t).Awaits(), "an open gate waits for nothing")
}

// What only warns closes no gate, so that there is nothing to wait for.
func TestDoesNotAwaitWhereUnprovenWarns(t *testing.T) {
	s := sceneOf()
	s.policy = edit(t, plain, `unproven = "close"`, `unproven = "warn"`)
	st := s.judge(t)
	require.Equal(t, budget.Open, st.Gate)
	assert.False(t, st.Awaits())
}

// An annotation stands where the head has the rule, which is elsewhere than in
// the policy that ruled.
func TestFindInThePolicyOfTheHead(t *testing.T) {
	regression := "\n[[regression]]\nname = \"no creep\"\nmeasure = \"total\"\nmax_rise = \"5%\"\n"
	s := sceneOf(night(meters(3)))
	s.policy = plain + regression
	st := s.judge(t)
	text := "# One line more.\n" + plain + regression
	head := policyOf(t, text)
	lines := map[string]int{}
	for _, r := range st.Rulings {
		at, ok := head.Find(r)
		require.True(t, ok, "%+v", r)
		assert.Equal(t, "budgetcheck.toml", at.File)
		lines[r.Name] = at.Line
	}
	assert.Equal(t, map[string]int{"one training": lineOf(t, text, "[[budget]]"), "no creep": lineOf(t, text, "[[regression]]"), "evidence": lineOf(t, text, "[[job]]")}, lines)
}

func TestFindWhatTheHeadDoesNotHave(t *testing.T) {
	st := sceneOf(night(scaled(2))).judge(t)
	without := policyOf(t, edit(t, plain, `name = "one training"`, `name = "another"`))
	_, ok := without.Find(ruling(t, st, "one training"))
	assert.False(t, ok)
	// Evidence of a job that is gone stands at the table of the evidence, if any.
	evidence := budget.Ruling{Kind: budget.KindEvidence, Job: "tow"}
	at, ok := policyOf(t, plain).Find(evidence)
	assert.True(t, ok)
	assert.Equal(t, lineOf(t, plain, "[evidence]"), at.Line)
	_, ok = policyOf(t, edit(t, plain, "[evidence]\nunproven = \"close\"\n", "")).Find(evidence)
	assert.False(t, ok)
	// A budget and a regression of one name are two rules.
	_, ok = policyOf(t, plain).Find(budget.Ruling{Kind: budget.KindRegression, Name: "one training"})
	assert.False(t, ok)
}
