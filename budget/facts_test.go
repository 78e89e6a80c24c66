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

// also keeps the required job satisfied beside the run in question.
func also(t *testing.T, change func(*sketch)) *scene {
	s := sceneOf(night(), night(called("other.ndjson", "n2"), scaled(1.001), func(s *sketch) { s.open.Host = "mole-2" }, change))
	s.policy = edit(t, plain, `job = "retrain-tide"`, `job = "**"`)
	return s
}

func TestUnknownJob(t *testing.T) {
	checkDoubt(t, also(t, func(s *sketch) { s.open.Job = "count-gulls" }), "the policy does not know job count-gulls at stage training; add a [[job]]")
	checkDoubt(t, also(t, func(s *sketch) { s.open.Stage = "evaluation" }), "the policy does not know job retrain-tide at stage evaluation")
	checkDoubt(t, also(t, func(s *sketch) { s.open.Stage = "" }), "the policy does not know job retrain-tide at stage (none)")
	s := sceneOf(night(func(s *sketch) { s.open.Stage = "evaluation" }))
	s.policy = edit(t, plain, "stage = \"training\"\n", "")
	checkFine(t, s, "a job without a stage may run at any")
}

func TestPlaces(t *testing.T) {
	restricted := edit(t, plain, "required = true\n", "required = true\nsites = [\"quay-north\"]\nmachines = [\"quad\"]\n") + "\n[machine.duo]\nunits = 2\n"
	cases := []struct {
		change func(*sketch)
		want   string
	}{
		{func(s *sketch) { s.open.Site = "quay-east" }, "site quay-east of night.ndjson is not in the policy; add [site.quay-east]"},
		{func(s *sketch) { s.open.Site = "" }, "night.ndjson names no site"},
		{func(s *sketch) { s.open.Site = "quay-south" }, "night.ndjson ran at site quay-south; the policy allows quay-north"},
		{func(s *sketch) { s.open.Machine = "octo" }, "machine octo of night.ndjson is not in the policy; add [machine.octo]"},
		{func(s *sketch) { s.open.Machine = "" }, "night.ndjson names no machine"},
		{func(s *sketch) { s.open.Machine = "duo" }, "night.ndjson ran on machine duo; the policy allows quad"},
	}
	for _, c := range cases {
		s := sceneOf(night(c.change, scaled(0.5)))
		s.policy = restricted
		checkDoubt(t, s, c.want)
	}
	s := sceneOf(night(scaled(0.5), func(s *sketch) { s.open.Site = "quay-south" }))
	checkFine(t, s, "without a list any site of the policy will do")
	st := sceneOf(night(func(s *sketch) { s.open.Site = "" })).judge(t)
	r := ruling(t, st, "one training")
	assert.Nil(t, r.Observed, "no site is not zero emissions")
	assert.Nil(t, st.Runs[0].Total)
}

func work(lines ...record.Work) func(*sketch) { return func(s *sketch) { s.work = lines } }

func TestWork(t *testing.T) {
	cases := []struct {
		name   string
		change func(*sketch)
		want   string // empty: fine
		pilot  bool
	}{
		{"all of it", work(record.Work{Unit: "step", Done: 1000}), "", false},
		{"more", work(record.Work{Unit: "step", Done: 2000, Planned: 2000}), "", false},
		{"no lines", work(), "run n1 has no work lines; job retrain-tide is 1000 step", false},
		{"another unit", work(record.Work{Unit: "epoch", Done: 1000}), "work of run n1 is told in epoch, that of job retrain-tide in step", false},
		{"less than planned", work(record.Work{Unit: "step", Done: 1500, Planned: 2000}), "run n1 is a pilot", true},
		{"less than the job's", work(record.Work{Unit: "step", Done: 999}), "run n1 is a pilot", true},
		{"plans less than the job's", work(record.Work{Unit: "step", Done: 500, Planned: 500}), "run n1 is a pilot", true},
		{"says so", func(s *sketch) { s.outcome = record.Pilot }, "run n1 is a pilot", true},
		{"stopped", func(s *sketch) { s.outcome, s.work[0].Done, s.work[0].Planned = record.Stopped, 10, 1000 }, "", false},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			s := sceneOf(night(c.change))
			s.policy = edit(t, plain, "required = true\n", "required = true\nwork = \"1000 step\"\n")
			var st *budget.Statement
			if c.want == "" {
				st = checkFine(t, s, c.name)
			} else {
				st = checkDoubt(t, s, c.want)
			}
			assert.Equal(t, c.pilot, st.Runs[0].Pilot)
		})
	}
}

// Without work in the policy the run's own plan tells.
func TestWorkOfUnplannedJob(t *testing.T) {
	checkFine(t, sceneOf(night(work())), "no work asked for")
	checkDoubt(t, sceneOf(night(work(record.Work{Unit: "step", Done: 1, Planned: 2}))), "run n1 is a pilot")
	checkDoubt(t, sceneOf(night(work(), func(s *sketch) { s.outcome = record.Pilot })), "run n1 is a pilot")
	shared := record.Work{Unit: "step", Done: 5, Planned: 10}
	each := record.Work{Unit: "step", Done: 5, Planned: 5, OfPart: true}
	checkDoubt(t, sceneOf(night(part("0"), work(shared)), night(part("1"), work(shared))), "run n1 is a pilot")
	checkFine(t, sceneOf(night(part("0"), work(each)), night(part("1"), work(each))), "parts add")
	epochs := record.Work{Unit: "epoch", Done: 5}
	checkDoubt(t, sceneOf(night(part("0"), work(shared)), night(part("1"), work(epochs))), "step", "epoch")
}

// attempt is the nth try at the same run.
func attempt(n int, outcome record.Outcome) sketch {
	return night(func(s *sketch) {
		s.file, s.open.Attempt, s.outcome = "try-"+string(rune('0'+n))+".ndjson", n, outcome
		s.watts = []float64{250, 250, 250, 250 + float64(n)}
		s.open.At = two.Add(unit.Duration(n) * unit.Hour)
	})
}

func TestAttempts(t *testing.T) {
	first, second, third := attempt(1, record.Failed), attempt(2, record.Failed), attempt(3, record.OK)
	st := checkFine(t, sceneOf(first, second, third), "all attempts")
	assert.Len(t, st.Runs, 3)
	assert.Contains(t, ruling(t, st, "one training").Reason, "worst of 3 runs", "all attempts are charged")

	const missing = ", and an earlier attempt's record is not there; give it too"
	st = checkDoubt(t, sceneOf(second, third), "run n1 is attempt 2"+missing, "run n1 is attempt 3"+missing)
	assert.Equal(t, []any{1.0, 2.0, "attempts"}, []any{*st.Rulings[0].Observed, *st.Rulings[0].Limit, st.Rulings[0].Unit})
	st = checkDoubt(t, sceneOf(first, third), "run n1 is attempt 3"+missing)
	assert.NotContains(t, strings.Join(doubts(st), ""), "attempt 1")
	checkDoubt(t, sceneOf(third), "run n1 is attempt 3")

	// What is charged of a missing attempt is not known, the rest is.
	s := sceneOf(third)
	s.policy = edit(t, plain, `"150 g"`, `"50 g"`)
	assert.Equal(t, budget.Over, ruling(t, s.judge(t), "one training").State)
	require.NotEmpty(t, doubts(s.judge(t)))
}
