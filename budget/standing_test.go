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

// checkUnchanged asks that evidence and budget of a job ask for nothing.
func checkUnchanged(t *testing.T, s *budget.Statement, jobs ...string) {
	t.Helper()
	found := map[string]int{}
	for _, r := range s.Rulings {
		if r.Reason == "inputs unchanged" {
			assert.Equal(t, budget.Within, r.State)
			found[r.Job]++
		}
	}
	want := map[string]int{}
	for _, job := range jobs {
		want[job] = 2
	}
	assert.Equal(t, want, found, "evidence and budget of each: %+v", s.Rulings)
}

func TestChangeOfDocumentation(t *testing.T) {
	h, base := started(t)
	head := h.commit("docs/tides.md", "Tides and streams.\n")
	st := h.change(paths, head, base, nil).judge(t)
	assert.Equal(t, budget.Open, st.Gate)
	checkUnchanged(t, st, "retrain-tide", "score-tide")
	// By default everything but policy and series is an input.
	st = h.change(plain, head, base, nil).judge(t)
	assert.Equal(t, budget.Closed, st.Gate)
	assert.Equal(t, []string{"job retrain-tide is required, and there is no head run of it"}, doubts(st))
}

// Neither the policy nor its series are inputs, unless paths says so.
func TestChangeOfPolicyAndSeries(t *testing.T) {
	h, base := started(t)
	head := h.commit("budgetcheck.toml", "format = 1 # mended\n", "grid/april.csv", steady)
	withSeries := edit(t, plain, "[account]", "[grid]\nseries = [\"grid/*.csv\"]\n\n[account]")
	st := h.change(withSeries, head, base, nil).judge(t)
	assert.Equal(t, budget.Open, st.Gate, st.Reason)
	checkUnchanged(t, st, "retrain-tide")
	assert.Equal(t, budget.Closed, h.change(plain, head, base, nil).judge(t).Gate, "a series that no policy names is a file like any")
	all := edit(t, withSeries, "required = true\n", "required = true\npaths = [\"**\"]\n")
	assert.Equal(t, budget.Closed, h.change(all, head, base, nil).judge(t).Gate)
}

// A job that the change does not touch is asked for nothing, one that it does is.
func TestMonorepo(t *testing.T) {
	h, base := started(t)
	head := h.commit("tide/train.py", "epochs = 12\n")
	st := h.change(paths, head, base, nil, night(of(head))).judge(t)
	assert.Equal(t, budget.Open, st.Gate, st.Reason)
	checkUnchanged(t, st, "score-tide")
	st = h.change(paths, head, base, nil).judge(t)
	assert.Equal(t, []string{"job retrain-tide is required, and there is no head run of it"}, doubts(st))
	// A run of the job that is not touched is shown and not judged.
	heavy := night(of(head), scored, scaled(9))
	st = h.change(paths, head, base, nil, night(of(head)), heavy).judge(t)
	assert.Equal(t, budget.Open, st.Gate, st.Reason)
	assert.Len(t, st.Runs, 2)
	assert.Contains(t, st.Notes, "the inputs of job score-tide are unchanged: run s1 is not judged")
}

// A run of the head stands for every commit that a merge makes of it.
func TestMergesOfAChange(t *testing.T) {
	for name, merge := range map[string]func(*history) string{
		"test merge": func(h *history) string { return h.committed("merge", "--quiet", "--no-commit", "--no-ff", "topic") },
		"squash":     func(h *history) string { return h.committed("merge", "--quiet", "--squash", "topic") },
		"rebase":     func(h *history) string { return h.committed("cherry-pick", "--no-commit", "main..topic") },
	} {
		t.Run(name, func(t *testing.T) {
			h, base := started(t)
			h.run("checkout", "--quiet", "-b", "topic")
			head := h.commit("tide/train.py", "epochs = 12\n")
			h.run("checkout", "--quiet", "main")
			h.commit("docs/tides.md", "Others were quicker.\n")
			merged := merge(h)
			require.NotEqual(t, head, merged)
			checkFine(t, h.change(onlyTraining(t), merged, base, []string{head}, night(of(head))), name)
			// What another change did to the same files is not in the run.
			h.commit("tide/tide.py", "x = 1\n")
			again := h.run("rev-parse", "HEAD")
			checkDoubt(t, h.change(onlyTraining(t), again, base, []string{head}, night(of(head))), "run it again")
		})
	}
}

func onlyTraining(t *testing.T) string {
	return edit(t, plain, "required = true\n", "required = true\npaths = [\"tide/**\"]\n")
}

// A revert brings back inputs that were judged already.
func TestRevert(t *testing.T) {
	h, base := started(t)
	longer := h.commit("tide/train.py", "epochs = 12\n")
	h.run("revert", "--no-edit", "HEAD")
	back := h.run("rev-parse", "HEAD")
	st := h.change(onlyTraining(t), back, base, nil).judge(t)
	assert.Equal(t, budget.Open, st.Gate)
	checkUnchanged(t, st, "retrain-tide")
	// Against the commit before, it is a change like any, and the old run stands for it.
	checkFine(t, h.change(onlyTraining(t), back, longer, []string{base}, night(of(base))), "a run of the start")
}

// Running again needs no new commit; an empty one changes no inputs.
func TestRunAgain(t *testing.T) {
	h, base := started(t)
	first := h.commit("tide/train.py", "epochs = 12\n")
	again := h.commit()
	require.NotEqual(t, first, again)
	st := checkFine(t, h.change(onlyTraining(t), again, base, []string{first}, night(of(first))), "the run of the commit before")
	assert.Equal(t, st.Runs[0].Inputs, h.tree(again).Hash([]string{"tide/**"}, nil))
}

func TestRunsThatStandForNothing(t *testing.T) {
	h, base := started(t)
	other := h.commit("tide/train.py", "epochs = 11\n")
	head := h.commit("tide/train.py", "epochs = 12\n")
	gone := strings.Repeat("ab", 20)
	for commit, words := range map[string][]string{
		other:     {"run n1 ran on commit " + other + ", where the inputs of job retrain-tide are not those of the head commit; run it again"},
		base:      {"run it again"},
		"main":    {"run n1 names its commit main; only a full id always means the same commit"},
		head[:12]: {"run n1 names its commit " + head[:12]},
		gone:      {"run n1 ran on commit " + gone + ", which is not in the repository"},
		"":        {"run n1 does not say with one voice on which commit it ran"},
	} {
		checkDoubt(t, h.change(onlyTraining(t), head, base, []string{other, base}, night(of(commit))), words...)
	}
	checkFine(t, h.change(onlyTraining(t), head, base, nil, night(of(head))), "a run of the head itself")
	// Whoever does not ask for it gets what was given.
	loose := edit(t, onlyTraining(t), `unproven = "close"`, "unproven = \"close\"\nsame_inputs = false")
	checkFine(t, h.change(loose, head, base, []string{other}, night(of(other))), "same_inputs = false")
}

// Parts that ran on two commits are one run of neither.
func TestPartsOnTwoCommits(t *testing.T) {
	h, base := started(t)
	head := h.commit("tide/train.py", "epochs = 12\n")
	two := func(name, commit string) sketch {
		return night(called(name+".ndjson", "n1"), of(commit), func(s *sketch) { s.open.Part, s.open.Parts, s.open.Host = name, 2, "mole-"+name }, scaled(map[string]float64{"1": 0.6, "2": 0.5}[name]))
	}
	checkDoubt(t, h.change(onlyTraining(t), head, base, []string{base}, two("1", head), two("2", base)), "with one voice")
}

// Without a repository, only a run of the head commit itself stands for it.
func TestNoRepositoryAtHand(t *testing.T) {
	a, b := strings.Repeat("aa", 20), strings.Repeat("bb", 20)
	s := sceneOf(night(of(a)))
	s.about.HeadCommit = a
	checkFine(t, s, "its own commit")
	s.head[0].open.Commit = b
	checkDoubt(t, s, "run n1 ran on commit "+b+", not the head commit, and there is no repository at hand to compare their inputs")
	s.head[0].open.Commit = ""
	checkDoubt(t, s, "write commit on the open line")
}

// Evidence that is bound to the change does not age: nothing changed since.
func TestBoundRunsDoNotAge(t *testing.T) {
	h, base := started(t)
	head := h.commit("tide/train.py", "epochs = 12\n")
	s := h.change(onlyTraining(t), head, base, nil, night(of(head)))
	s.about.Now = two.Add(40 * unit.Day)
	checkFine(t, s, "forty days later")
	loose := edit(t, onlyTraining(t), `unproven = "close"`, "unproven = \"close\"\nsame_inputs = false")
	s = h.change(loose, head, base, []string{base}, night(of(base)))
	s.about.Now = two.Add(40 * unit.Day)
	checkDoubt(t, s, "ended 40.0 d ago")
}

// A base run of other inputs than the merge base's still counts, and is named.
func TestBaseOfOtherInputs(t *testing.T) {
	h, old := started(t)
	base := h.commit("tide/train.py", "epochs = 11\n")
	head := h.commit("tide/train.py", "epochs = 12\n")
	s := h.change(onlyTraining(t), head, base, []string{old, base}, night(of(head)))
	before := func(run, commit string, days unit.Duration) sketch {
		return night(called(run+".ndjson", run), of(commit), func(s *sketch) { s.open.At = two.Add(-days * unit.Day) })
	}
	s.base = []sketch{before("b1", base, 1), before("b2", old, 2)}
	st := checkFine(t, s, "two base runs")
	assert.Contains(t, st.Notes, "base runs with other inputs than the merge base fill the base up: b2")
	assert.Equal(t, 2, st.Changes[0].BaseRuns)
}

// A job at a stage that no table names is not bound to anything.
func TestRunOfAnUnknownJob(t *testing.T) {
	h, base := started(t)
	head := h.commit("docs/tides.md", "Tides and streams.\n")
	stray := night(of(base), func(s *sketch) { s.open.Job = "tow" })
	st := h.change(onlyTraining(t), head, base, nil, stray).judge(t)
	assert.Equal(t, budget.Closed, st.Gate)
	assert.Contains(t, strings.Join(doubts(st), "\n"), "the policy does not know job tow")
	checkUnchanged(t, st, "retrain-tide")
	stray = night(of(head), func(s *sketch) { s.outcome = record.Failed })
	assert.Equal(t, budget.Open, h.change(onlyTraining(t), head, base, nil, stray).judge(t).Gate, "nothing is asked of a job that is not touched")
}

// Paths that match nothing would be unchanged for ever. Then a run of the head
// commit itself is asked for, and no other stands for it.
func TestPathsThatMatchNothing(t *testing.T) {
	h, base := started(t)
	head := h.commit("tide/train.py", "epochs = 12\n")
	misspelt := edit(t, onlyTraining(t), "tide/**", "tdie/**")
	st := h.change(misspelt, head, base, nil).judge(t)
	assert.Equal(t, []string{"job retrain-tide is required, and there is no head run of it"}, doubts(st))
	checkDoubt(t, h.change(misspelt, head, base, []string{base}, night(of(base))), "of which no file matches the paths of job retrain-tide")
	checkFine(t, h.change(misspelt, head, base, nil, night(of(head))), "a run of the head itself")
}
