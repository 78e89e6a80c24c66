package budget_test

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/finding"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// checkFine asks that nothing is doubted.
func checkFine(t *testing.T, s *scene, why string) *budget.Statement {
	t.Helper()
	st := s.judge(t)
	assert.Empty(t, doubts(st), why)
	assert.Equal(t, budget.Open, st.Gate, why)
	for _, r := range st.Rulings {
		assert.Equal(t, budget.Within, r.State, "%s: %+v", why, r)
	}
	return st
}

// checkDoubt asks that the evidence is in doubt for a reason that has the
// words, and that the budget is unproven for it.
func checkDoubt(t *testing.T, s *scene, words ...string) *budget.Statement {
	t.Helper()
	st := s.judge(t)
	assert.Equal(t, budget.Closed, st.Gate)
	assert.Equal(t, budget.Unproven, ruling(t, st, "one training").State, "%v", words)
	all := strings.Join(doubts(st), "\n")
	for _, w := range words {
		assert.Contains(t, all, w)
	}
	return st
}

func TestNothingToDoubt(t *testing.T) {
	st := checkFine(t, sceneOf(night()), "a night as it should be")
	require.Len(t, st.Rulings, 2)
	r := ruling(t, st, "one training")
	assert.Equal(t, []any{100.0, 150.0, "g", 100.0 / 150}, []any{*r.Observed, *r.Limit, r.Unit, *r.Share})
	assert.Equal(t, "of 2 rulings 2 within", st.Reason)
}

// A malformed line hides neither its neighbours nor other records.
func TestMalformedLine(t *testing.T) {
	bad := night(func(s *sketch) {
		s.lines = []string{`{"k":"power","at":"2031-03-10T03:00:00Z","meter":"gpu9","w":-3}`, `{"k":"power"`}
	})
	st := checkDoubt(t, sceneOf(bad), "2 lines of night.ndjson cannot count, first night.ndjson:247: ", "below zero")
	assert.Equal(t, 100.0, *ruling(t, st, "one training").Observed, "the rest is shown")

	score := night(called("score.ndjson", "s1"), func(s *sketch) { s.open.Job, s.open.Host = "score-tide", "mole-2" }, scaled(1.01))
	s := sceneOf(bad, score)
	s.policy = plain + "\n[[job]]\nname = \"score-tide\"\n\n[[budget]]\nname = \"one scoring\"\njob = \"score-tide\"\nlimit = \"1 kg\"\nper = \"run\"\n"
	assert.Equal(t, budget.Within, ruling(t, checkDoubt(t, s, "night.ndjson"), "one scoring").State, "the others are judged")
}

// A torn last line loses that line only.
func TestTornLine(t *testing.T) {
	s := sceneOf(night(func(s *sketch) { s.lines, s.outcome = []string{`{"k":"clo`}, "" }))
	text := s.head[0].text(t)
	p := policyOf(t, plain)
	part := weigh(t, p, seriesOf(t, steady), "night.ndjson", strings.TrimSuffix(text, "\n"))
	assert.Zero(t, part.Findings.Len())
	require.Len(t, part.Notes, 1)
	assert.Contains(t, part.Notes[0], "night.ndjson:247: the last line is torn")
}

func TestFilesThatAreNoRuns(t *testing.T) {
	s := sceneOf(night())
	s.about.Unread = []finding.Finding{{File: "lost.ndjson.gz", What: "the record cannot be read", Do: "give the whole file"}}
	st := s.judge(t)
	assert.Equal(t, []string{"lost.ndjson.gz: the record cannot be read; give the whole file"}, doubts(st))
	assert.Equal(t, budget.Within, ruling(t, st, "one training").State)
	assert.Equal(t, []any{budget.Closed, lineOf(t, plain, "[evidence]")}, []any{st.Gate, st.Rulings[0].PolicyLine})

	p, set := policyOf(t, plain), seriesOf(t, steady)
	c := sceneOf().about
	c.Head = append(c.Head, weigh(t, p, set, "night.ndjson", night().text(t)), weigh(t, p, set, "empty.ndjson", ""), weigh(t, p, set, "page.ndjson", "<html>\n"))
	st = p.Judge(c)
	require.Len(t, doubts(st), 2)
	assert.Contains(t, doubts(st)[0], "empty.ndjson belongs to no run: empty.ndjson:1: ")
	assert.Contains(t, doubts(st)[1], "page.ndjson belongs to no run: page.ndjson:1: ")
	assert.Equal(t, budget.Closed, st.Gate)
}

func TestRequiredJob(t *testing.T) {
	st := checkDoubt(t, sceneOf(), "job retrain-tide is required, and there is no head run of it")
	for _, r := range st.Rulings {
		assert.Nil(t, r.Observed, "no record is not zero emissions")
		assert.Equal(t, "retrain-tide", r.Job)
	}
	assert.Equal(t, lineOf(t, plain, "[[job]]"), st.Rulings[0].PolicyLine)

	for _, outcome := range []record.Outcome{record.Failed, record.Cancelled, ""} {
		want := outcome
		if outcome == "" { // killed: no close line
			want = record.Failed
		}
		st = checkDoubt(t, sceneOf(night(func(s *sketch) { s.outcome = outcome })), "job retrain-tide is required, and the outcome of its run n1 is "+string(want))
		assert.EqualValues(t, 100, *st.Runs[0].Total, "all outcomes are charged")
	}
	checkFine(t, sceneOf(night(func(s *sketch) { s.outcome = record.Stopped })), "ended early on purpose")

	s := sceneOf()
	s.policy = edit(t, plain, "required = true", "required = false")
	st = s.judge(t)
	assert.Equal(t, []string{"there is no head run to judge"}, doubts(st))
	assert.Equal(t, budget.Closed, st.Gate)
}

// What a failed run spent is spent.
func TestFailedRunIsCharged(t *testing.T) {
	st := sceneOf(night(scaled(2), func(s *sketch) { s.outcome = record.Failed })).judge(t)
	r := ruling(t, st, "one training")
	assert.Equal(t, []any{budget.Over, 200.0}, []any{r.State, *r.Observed})
}

// part is one of two parts that share the night's work.
func part(name string) func(*sketch) {
	return func(s *sketch) {
		s.file, s.open.Part, s.open.Parts, s.open.Host = "part-"+name+".ndjson", name, 2, "mole-"+name
		s.watts = []float64{125, 125, 125, 125}
		if name == "1" {
			s.watts[0] += 0.001 // two machines never read the same
		}
	}
}

func TestParts(t *testing.T) {
	st := checkFine(t, sceneOf(night(part("0")), night(part("1"))), "both parts")
	require.Len(t, st.Runs, 1)
	assert.InDelta(t, 100, float64(*st.Runs[0].Total), 0.001, "totals are sums over parts")
	checkDoubt(t, sceneOf(night(part("1"))), "part missing: run n1 has 1 of 2 parts")
}

func TestSamePartTwice(t *testing.T) {
	again := func(s *sketch) { s.file = "again.ndjson" }
	st := checkFine(t, sceneOf(night(), night(again)), "the same content counts once")
	require.Len(t, st.Runs, 1)
	assert.EqualValues(t, 100, *st.Runs[0].Total)
	assert.Contains(t, st.Runs[0].Notes, "again.ndjson and night.ndjson are the same part of the same run: counted once")

	others := map[string]func(*sketch){
		"energy":    scaled(1.01),
		"end":       func(s *sketch) { s.length += unit.Minute },
		"outcome":   func(s *sketch) { s.outcome = record.Stopped },
		"work":      func(s *sketch) { s.work[0].Done = 2000 },
		"site":      func(s *sketch) { s.open.Site = "quay-south" },
		"host":      func(s *sketch) { s.open.Host = "mole-7" },
		"open time": func(s *sketch) { s.open.At = two.Add(unit.Second) },
		"bad line":  func(s *sketch) { s.lines = []string{"{"} },
	}
	for name, other := range others {
		t.Run(name, func(t *testing.T) {
			s := sceneOf(night(), night(again, other))
			st := checkDoubt(t, s, "again.ndjson", "night.ndjson", "are the same part of the same run with different content")
			require.Len(t, st.Runs, 1)
			s.policy = edit(t, plain, `"150 g"`, `"50 g"`)
			assert.Equal(t, budget.Unproven, ruling(t, s.judge(t), "one training").State, "a contradiction proves nothing")
		})
	}
}

// A copy of a record under another run's name would fake a second run.
func TestCopies(t *testing.T) {
	two := func(s *sketch) { s.file, s.open.Run, s.open.Host = "copy.ndjson", "n2", "mole-2" }
	renamed := func(s *sketch) { s.meters = []string{"a", "b", "c", "d"} }
	for _, changes := range [][]func(*sketch){{two}, {two, renamed}} {
		s := sceneOf(night(), night(changes...))
		checkDoubt(t, s, "copy.ndjson", "night.ndjson", "have the same energy lines")
		s.policy = edit(t, plain, `"150 g"`, `"50 g"`)
		assert.Equal(t, budget.Over, ruling(t, s.judge(t), "one training").State, "either alone passes the limit: adding a copy is no way out")
	}
	checkFine(t, sceneOf(night(), night(two, scaled(1.001))), "another run")

	// Nor does a record of the base show what the head does.
	s := sceneOf(night(two))
	s.base = []sketch{night(called("old.ndjson", "n0"))}
	checkDoubt(t, s, "copy.ndjson", "old.ndjson", "have the same energy lines")
}
