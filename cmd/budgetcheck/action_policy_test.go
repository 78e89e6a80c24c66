package main

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/record"
)

// A change cannot raise its own limit: the policy comes from the tip of the
// target, and what the head's would say stands beside.
func TestPolicyOfTheTarget(t *testing.T) {
	w := newWorld(t, map[string]string{policyName: strings.Replace(targetPolicy, "150 g", "900 g", 1)})
	o := w.run(w.pull(heavy(t, w.head)))
	assert.Equal(t, exitFinding, o.status)
	assert.Contains(t, o.statement, "200 g` | `150 g")
	assert.Contains(t, o.statement, "900 g", "the edit is shown")
	assert.Contains(t, o.statement, w.base[:12], "and which policy ruled")
}

// The tip is that of now, not that of when the branch was made.
func TestPolicyOfTheTipAndNotOfTheMergeBase(t *testing.T) {
	w := newWorld(t, nil)
	w.repo.Checkout("main")
	w.repo.Commit("tighten", map[string]string{policyName: strings.Replace(targetPolicy, "150 g", "90 g", 1)})
	for _, workspace := range []string{"", w.clone("topic"), w.clone("topic", "--depth", "1")} {
		s := w.pull(lean(t, w.head))
		s.dir = workspace
		o := w.run(s)
		assert.Equal(t, exitFinding, o.status)
		assert.Contains(t, o.statement, "100 g` | `90.0 g")
	}
}

// What lies in the workspace is the change's to write, and is not read.
func TestPolicyAndSeriesOfTheWorkspaceDoNotCount(t *testing.T) {
	w := newWorld(t, map[string]string{"grid/march.csv": strings.Replace(steady, ",100,", ",1,", 1)})
	s := w.pull(heavy(t, w.head))
	s.records[policyName] = strings.Replace(targetPolicy, "150 g", "900 g", 1)
	s.records["grid/march.csv"] = strings.Replace(steady, ",100,", ",1,", 1)
	o := w.run(s)
	assert.Equal(t, exitFinding, o.status)
	assert.Contains(t, o.statement, "200 g` | `150 g")
}

// A policy that cannot be read after merge would stop everybody: it closes the
// gate, says where, and there is no line to annotate.
func TestPolicyOfTheHeadIsUnreadable(t *testing.T) {
	for name, target := range map[string]string{"closes": targetPolicy, "also where unproven only warns": targetPolicy + "\n[evidence]\nunproven = \"warn\"\n"} {
		t.Run(name, func(t *testing.T) {
			w := newWorld(t, nil)
			w.repo.Checkout("main")
			w.base = w.repo.Commit("target", map[string]string{policyName: target})
			w.repo.Branch("other", w.base)
			w.head = w.repo.Commit("break", map[string]string{policyName: target + "\nlimmit = 1\n", "tide/train.py": "epochs = 12\n"})
			o := w.run(w.pull(lean(t, w.head)))
			assert.Equal(t, exitFinding, o.status)
			assert.Contains(t, o.statement, "policy of the head")
			assert.Contains(t, o.statement, "budgetcheck.toml:"+jsonText(t, strings.Count(target, "\n")+2))
			assert.Empty(t, w.api.CheckRuns()[0].Annotations)
		})
	}
}

// adopted is a world whose main has no policy yet.
func adopted(t *testing.T, head map[string]string) *world {
	w := newWorld(t, nil)
	w.repo.Checkout("main")
	w.base = w.repo.Commit("none yet", map[string]string{policyName: ""})
	w.repo.Branch("adopt", w.base)
	w.head = w.repo.Commit("adopt", head)
	return w
}

// The first policy comes with its series, and is what a statement names.
func TestAdoption(t *testing.T) {
	w := adopted(t, map[string]string{policyName: strings.Replace(targetPolicy, "grid/*", "first/*", 1), "first/march.csv": steady, "tide/train.py": "epochs = 12\n"})
	o := w.run(w.pull(heavy(t, w.head)))
	assert.Equal(t, exitDone, o.status, o.complaint)
	assert.Equal(t, "open", o.outputs["gate"])
	assert.Contains(t, o.statement, "branch `main` has no policy yet; by this change's own, `one training` is over by `50.0 g`")
	assert.Contains(t, o.statement, "budgetcheck.toml at "+w.head[:12])
	assert.Equal(t, "success", w.api.CheckRuns()[0].Conclusion)
}

func TestAdoptionOfWhatCannotBeRead(t *testing.T) {
	w := adopted(t, map[string]string{policyName: "format = 2\n"})
	o := w.run(w.pull(heavy(t, w.head)))
	assert.Equal(t, exitCannot, o.status)
	assert.Contains(t, o.complaint, "the policy at "+w.head)
	assert.Contains(t, o.complaint, "budgetcheck.toml:1")
	// No policy on either side is no adoption.
	w = adopted(t, map[string]string{"docs/tides.md": "More.\n"})
	o = w.run(w.pull(heavy(t, w.head)))
	assert.Equal(t, exitCannot, o.status)
	assert.Contains(t, o.complaint, "there is no policy budgetcheck.toml on branch main nor in this change")
}

// A change that takes the policy away is judged by it, and that is said.
func TestPolicyIsRemoved(t *testing.T) {
	w := newWorld(t, map[string]string{policyName: ""})
	o := w.run(w.pull(heavy(t, w.head)))
	assert.Equal(t, exitFinding, o.status)
	assert.Contains(t, o.statement, "this change removes the policy")
}

// scoring is the second team of a monorepo: its policy adds to the first.
const scoring = `
[[job]]
name = "score-tide"
stage = "evaluation"
required = true
paths = ["score/**"]

[[budget]]
name = "one scoring"
branch = "main"
job = "score-tide"
limit = "50 g"
per = "run"
`

// Two policies add up, the job that a change does not touch is not asked for,
// and a gate for some jobs looks at no other.
func TestMonorepo(t *testing.T) {
	w := newWorld(t, nil)
	w.repo.Checkout("main")
	w.base = w.repo.Commit("two teams", map[string]string{"score/budget.toml": "format = 1\n" + scoring, "score/score.py": "x = 1\n"})
	w.repo.Branch("change", w.base)
	w.head = w.repo.Commit("train longer", map[string]string{"tide/train.py": "epochs = 12\n"})
	both := map[string]string{"policy": "budgetcheck.toml\nscore/budget.toml\n"}
	s := w.pull(lean(t, w.head))
	s.inputs = both
	o := w.run(s)
	require.Equal(t, exitDone, o.status, "%s%s", o.log, o.complaint)
	assert.Contains(t, o.statement, "budgetcheck.toml and score/budget.toml at "+w.base[:12])
	assert.Contains(t, o.statement, "inputs unchanged")
	// Now the change touches both, and each team's gate asks for its own.
	w.head = w.repo.Commit("score", map[string]string{"score/score.py": "x = 2\n"})
	s = w.pull(lean(t, w.head))
	s.inputs = both
	o = w.run(s)
	assert.Equal(t, exitFinding, o.status)
	assert.Contains(t, o.statement, "job score-tide is required, and there is no head run of it")
	s.inputs = map[string]string{"policy": both["policy"], "job": "retrain-*\n"}
	o = w.run(s)
	assert.Equal(t, exitDone, o.status, o.statement)
	assert.NotContains(t, o.statement, "score-tide")
	s.records["records/score.ndjson"] = training(t, "s1", w.head, 250, func(open *record.Open) { open.Job, open.Stage, open.Host = "score-tide", "evaluation", "mole-2" })
	s.inputs["job"] = "score-*"
	o = w.run(s)
	assert.Equal(t, exitFinding, o.status)
	assert.Contains(t, o.statement, "one scoring")
	assert.NotContains(t, o.statement, "one training")
}
