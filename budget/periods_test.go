package budget_test

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/unit"
)

// monthly is plain with a budget for a month besides; a night takes 100 g.
func monthly(limit, more string) string {
	return plain + "\n[[budget]]\nname = \"month\"\nbranch = \"main\"\nlimit = \"" + limit + "\"\nper = \"month\"\n" + more
}

// scheduled makes the training run every night at two.
func scheduled(t test, policy string) string {
	return edit(t, policy, "required = true\n", "required = true\nschedule = \"0 2 * * *\"\n")
}

// ranOn makes the run one of a commit, which is told by a letter.
func ranOn(letter string) func(*sketch) {
	return func(s *sketch) { s.open.Commit = strings.Repeat(letter, 40) }
}

func grams(t test, m *unit.Mass) float64 {
	require.NotNil(t, m)
	return float64(*m)
}

// Without a ledger the past of the period is not known; what the head runs are
// proven to emit counts all the same.
func TestPeriodWithoutLedger(t *testing.T) {
	for _, per := range []string{"day", "week", "month", "quarter", "year", "release"} {
		s := sceneOf(night())
		s.policy = edit(t, monthly("1 t", ""), `per = "month"`, `per = "`+per+`"`)
		r := ruling(t, s.judge(t), "month")
		assert.Equal(t, []any{budget.Unproven, per}, []any{r.State, r.Per})
		assert.Contains(t, r.Reason, "add -ledger")
	}
	s := sceneOf(night())
	s.policy = monthly("99 g", "")
	assert.Equal(t, budget.Over, ruling(t, s.judge(t), "month").State)
	s.about.Pull = 7 // nothing of it is charged to the month
	assert.Equal(t, budget.Unproven, ruling(t, s.judge(t), "month").State)
}

// On a push the month is what its nights add up to, this one included, whether
// it is booked yet or not. Where it only lands over the limit it is near.
func TestMonthOnPush(t *testing.T) {
	for _, given := range []bool{true, false} {
		for limit, want := range map[string]budget.State{"600 g": budget.Near, "599.9 g": budget.Over, "3.11 kg": budget.Within} {
			s := sceneOf()
			s.about.HeadCommit = strings.Repeat("b", 40)
			s.books = bookedNights(5, 1, ranOn("a"))
			if given {
				s.head = []sketch{night(ranOn("b"))}
			} else {
				s.books = append(s.books, booked{sketch: night(ranOn("b")), account: "main"})
			}
			s.policy = scheduled(t, monthly(limit, ""))
			st := s.judge(t)
			r := ruling(t, st, "month")
			assert.Equal(t, want, r.State, "%v, limit %s: %s", given, limit, r.Reason)
			assert.InDelta(t, 600, *r.Observed, 1e-9)
			a := st.Accounts[1]
			assert.Equal(t, "2031-03", a.Period)
			assert.InDelta(t, 500, grams(t, a.Brought), 1e-9)
			assert.InDelta(t, 100, grams(t, a.Change), 1e-9)
			assert.InDelta(t, 600, grams(t, a.Carried), 1e-9)
			require.Len(t, st.Landings, 1)
		}
	}
}

// A run that is given and booked is one run, in brought forward, base and head.
func TestNoRunCountsTwice(t *testing.T) {
	s := sceneOf(night(ranOn("b")))
	s.about.HeadCommit = strings.Repeat("b", 40)
	s.books = append(bookedNights(5, 1, ranOn("a")), booked{sketch: night(ranOn("b")), account: "main"})
	s.base = []sketch{bookedNights(1, 1)[0].sketch}
	s.policy = monthly("1 kg", "")
	st := s.judge(t)
	assert.InDelta(t, 600, *ruling(t, st, "month").Observed, 1e-9)
	require.Len(t, st.Changes, 1)
	assert.Equal(t, []int{5, 1}, []int{st.Changes[0].BaseRuns, st.Changes[0].HeadRuns})
	assert.Len(t, st.Runs, 6)
	assert.Contains(t, strings.Join(st.Notes, "\n"), "the ledger has base runs of job retrain-tide")
}

// Energy belongs to the hours it was used in: a run over midnight is cut.
func TestRunOverMidnight(t *testing.T) {
	s := sceneOf()
	late := bookedNights(1, 0, func(s *sketch) { s.length = 2 * unit.Hour })[0]
	late.open.At = unit.Instant(two).Add(-3 * unit.Hour) // 23:00 to 01:00
	s.books = []booked{late}
	s.policy = edit(t, monthly("1 kg", ""), `per = "month"`, `per = "day"`)
	assert.InDelta(t, 100, *ruling(t, s.judge(t), "month").Observed, 1e-9)
	s.policy = edit(t, s.policy, "[account]\n", "[account]\ntimezone = \"Asia/Kolkata\"\n") // its day starts at 18:30 UTC
	assert.InDelta(t, 200, *ruling(t, s.judge(t), "month").Observed, 1e-9)
	s.policy = edit(t, s.policy, "Asia/Kolkata", "Africa/Cairo") // and this one's at 22:00
	assert.InDelta(t, 200, *ruling(t, s.judge(t), "month").Observed, 1e-9)
}

// What is in doubt leaves the sum unproven; what is proven is over all the same.
func TestDoubtInTheBooks(t *testing.T) {
	s := sceneOf(night())
	s.books = bookedNights(5, 1)
	s.books[2].meters, s.books[2].watts = nil, nil // no energy at all
	s.policy = monthly("1 kg", "")
	r := ruling(t, s.judge(t), "month")
	assert.Equal(t, budget.Unproven, r.State)
	assert.Contains(t, r.Reason, "b3")
	s.policy = monthly("450 g", "")
	assert.Equal(t, budget.Over, ruling(t, s.judge(t), "month").State)
}

// A pull request has an account of its own: its earlier pushes are brought
// forward, its head runs are this change.
func TestPullAccount(t *testing.T) {
	s := sceneOf()
	s.about.Pull, s.about.HeadCommit = 7, strings.Repeat("b", 40)
	on := func(commit string, back int) booked {
		b := bookedNights(1, back, ranOn(commit))[0]
		b.account = "pull/7"
		return b
	}
	s.books = []booked{on("a", 2), on("a", 1), on("b", 0)}
	s.policy = edit(t, monthly("300 g", ""), `per = "month"`, `per = "pull"`)
	st := s.judge(t)
	assert.Equal(t, budget.Within, ruling(t, st, "month").State)
	a := st.Accounts[1]
	assert.InDelta(t, 200, grams(t, a.Brought), 1e-9)
	assert.InDelta(t, 100, grams(t, a.Change), 1e-9)
	assert.Equal(t, budget.Open, st.Gate, st.Reason)
	s.policy = edit(t, s.policy, "300 g", "299 g")
	assert.Equal(t, budget.Over, ruling(t, s.judge(t), "month").State)
	s.about.Pull = 0 // of a branch there is none
	for _, r := range s.judge(t).Rulings {
		assert.NotEqual(t, "month", r.Name)
	}
}

// Releases open and close accounts; without any, all the books count.
func TestPerRelease(t *testing.T) {
	s := sceneOf(night())
	s.books = bookedNights(5, 1)
	s.policy = edit(t, monthly("350 g", ""), `per = "month"`, `per = "release"`)
	r := ruling(t, s.judge(t), "month")
	assert.Equal(t, budget.Over, r.State)
	mark := func(tag, branch string, back int) *ledger.Mark {
		return &ledger.Mark{Kind: ledger.KindRelease, Tag: tag, Branch: branch, At: two.Add(-unit.Duration(back)*unit.Day - unit.Hour)}
	}
	s.marks = []*ledger.Mark{mark("v1", "main", 5), mark("v2", "main", 2), mark("v9", "harbour-works", 1)}
	r = ruling(t, s.judge(t), "month")
	assert.Equal(t, []any{budget.Within, "since release v2"}, []any{r.State, r.Reason})
	assert.InDelta(t, 300, *r.Observed, 1e-9)
	s.about.Tags, s.marks = []*ledger.Mark{mark("v3", "main", 1)}, nil
	assert.InDelta(t, 200, *ruling(t, s.judge(t), "month").Observed, 1e-9)
}

// A rate over a period is the sum of emissions by the sum of work.
func TestRateOverMonth(t *testing.T) {
	s := sceneOf(night())
	s.books = bookedNights(2, 1)
	s.books[0].work[0].Done = 8000 // the others do 1000
	s.policy = monthly("30 g per 1000 step", "")
	r := ruling(t, s.judge(t), "month")
	assert.Equal(t, budget.Within, r.State)
	assert.InDelta(t, 0.03, *r.Observed, 1e-12)
}

// A pull request is judged by where the month lands with it. It closes the gate
// only if it raises the landing and the policy says so.
func TestLandingOfPullRequest(t *testing.T) {
	s := sceneOf(night(scaled(1.2)))
	s.about.Pull = 7
	s.books = bookedNights(9, 1)
	s.series = edit(t, steady, "NORTH,2031-03-01T00:00:00Z", "NORTH,2031-01-01T00:00:00Z")
	// 9 nights are spent, 22 are left: 31 x 100 g without the change.
	without, with := 3100.0, 900+22*120.0
	for _, c := range []struct {
		limit, landing string
		want           budget.State
	}{
		{"4 kg", "close", budget.Within},
		{"3.3 kg", "close", budget.Over},
		{"3.3 kg", "warn", budget.Near},
		{"3 kg", "warn", budget.Near},
		{"800 g", "warn", budget.Near},
	} {
		s.policy = scheduled(t, monthly(c.limit, "landing = \""+c.landing+"\"\n"))
		st := s.judge(t)
		r := ruling(t, st, "month")
		assert.Equal(t, c.want, r.State, "%+v: %s", c, r.Reason)
		require.Len(t, st.Landings, 2)
		l := st.Landings[0]
		assert.InEpsilon(t, without, grams(t, l.Without), 1e-9)
		assert.InEpsilon(t, with, grams(t, l.Expected), 1e-9)
		assert.InEpsilon(t, 900, grams(t, l.Spent), 1e-9)
		assert.EqualValues(t, 22, l.RunsLeft)
		assert.Equal(t, "2031-04", st.Landings[1].Period)
		assert.InEpsilon(t, 30*120, grams(t, st.Landings[1].Expected), 1e-9)
	}
	s.policy = scheduled(t, monthly("800 g", "landing = \"close\"\n"))
	s.head = []sketch{night(scaled(0.8))} // lowers it: what others spent is theirs
	r := ruling(t, s.judge(t), "month")
	assert.Equal(t, []any{budget.Near, "over before this change"}, []any{r.State, r.Reason})
}

// A waiver lifts the limit of its rule to the end of its date, for its pull
// request, or excuses what is unproven; nothing else.
func TestWaivers(t *testing.T) {
	waiver := func(keys string) string {
		return "\n[[waiver]]\nrule = \"one training\"\nreason = \"backfill\"\napproved_by = \"@quay-lead\"\n" + keys
	}
	over, thin := sceneOf(night(scaled(2))), sceneOf(night(func(s *sketch) { s.hole = [2]unit.Duration{10 * unit.Minute, 50 * unit.Minute} }))
	for _, c := range []struct {
		s    *scene
		keys string
		want budget.State
	}{
		{over, "extra = \"50 g\"\nexpires = 2031-03-10\n", budget.Waived},
		{over, "extra = \"49 g\"\nexpires = 2031-03-10\n", budget.Over},
		{over, "extra = \"50 g\"\nexpires = 2031-03-09\n", budget.Over},
		{over, "extra = \"50 g\"\npull = 8\nexpires = 2031-03-10\n", budget.Over},
		{over, "extra = \"50 g\"\npull = 7\nexpires = 2031-03-10\n", budget.Waived},
		{over, "expires = 2031-03-10\n", budget.Over},
		{thin, "expires = 2031-03-10\n", budget.Waived},
		{thin, "extra = \"1 kg\"\nexpires = 2031-03-10\n", budget.Unproven},
	} {
		c.s.policy, c.s.about.Pull = plain+waiver(c.keys), 7
		st := c.s.judge(t)
		r := ruling(t, st, "one training")
		assert.Equal(t, c.want, r.State, "%s: %s", c.keys, r.Reason)
		if r.State == budget.Waived {
			assert.Contains(t, r.Reason, "backfill")
			assert.Contains(t, r.Reason, "@quay-lead")
		}
	}
	over.policy = plain + waiver("extra = \"50 g\"\nexpires = 2031-03-09\n")
	assert.Contains(t, strings.Join(over.judge(t).Notes, "\n"), "expired at the end of 2031-03-09")
	over.policy = edit(t, over.policy, "[account]\n", "[account]\ntimezone = \"Pacific/Honolulu\"\n") // the 10th begins at 10:00 UTC
	over.about.Now = two.Add(7 * unit.Hour)
	assert.Equal(t, budget.Waived, ruling(t, over.judge(t), "one training").State)
}
