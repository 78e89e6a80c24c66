package budget_test

import (
	"fmt"
	"slices"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// onCommit makes the case one of a commit, which is told by a letter.
func (s *scene) onCommit(letter string) *scene {
	s.about.HeadCommit = strings.Repeat(letter, 40)
	return s
}

// bookedAs books a record to an account.
func bookedAs(account string, one sketch) booked { return booked{sketch: one, account: account} }

// daily is plain with a budget for the day besides, or for another period.
func daily(limit, more string) string {
	return strings.Replace(monthly(limit, more), `per = "month"`, `per = "day"`, 1)
}

// spentIn is what a period budget observed, in the unit of its limit.
func spentIn(t test, st *budget.Statement) float64 {
	t.Helper()
	r := ruling(t, st, "month")
	require.NotNil(t, r.Observed, r.Reason)
	return *r.Observed
}

// A run that is given and booked is spent once, whatever speaks against it: its
// commit, its age, a job that the policy does not know.
func TestDoubtfulRunCountsOnce(t *testing.T) {
	for name, change := range map[string]func(*sketch){
		"another commit":   ranOn("c"),
		"old":              func(s *sketch) { s.open.Commit, s.open.At = strings.Repeat("b", 40), two.Add(-5*unit.Day-12*unit.Hour) },
		"an unknown job":   func(s *sketch) { s.open.Commit, s.open.Job = strings.Repeat("b", 40), "count-gulls" },
		"an unknown stage": func(s *sketch) { s.open.Commit, s.open.Stage = strings.Repeat("b", 40), "dredging" },
		"nothing":          ranOn("b"),
	} {
		s := sceneOf(night(change)).onCommit("b")
		s.books = append(bookedNights(3, 1, ranOn("a")), bookedAs("main", night(change)))
		s.policy = monthly("1 t", "")
		a := s.judge(t).Accounts
		require.Len(t, a, 2)
		assert.InDelta(t, 400, grams(t, a[1].Carried), 1e-9, name)
	}
}

// One part is given and another is booked: together they are one run, and
// either is spent once.
func TestPartsFromFileAndBooks(t *testing.T) {
	s := sceneOf(night(part("0"), ranOn("b"))).onCommit("b")
	s.books = append(bookedNights(3, 1, ranOn("a")), bookedAs("main", night(part("1"), ranOn("b"))))
	s.policy = monthly("10 kg", "")
	st := s.judge(t)
	assert.InDelta(t, 400, grams(t, st.Accounts[1].Carried), 1e-3)
	assert.Equal(t, budget.Within, ruling(t, st, "month").State, ruling(t, st, "month").Reason)
	assert.InDelta(t, 100.001, *ruling(t, st, "one training").Observed, 1e-3)
	s.head = nil // the other part never came
	st = s.judge(t)
	assert.Equal(t, budget.Unproven, ruling(t, st, "month").State)
	assert.Contains(t, strings.Join(doubts(st), "\n"), "part missing")
	s.policy = monthly("325 g", "") // the nights and the part that is there are spent
	assert.Equal(t, budget.Over, ruling(t, s.judge(t), "month").State)
}

// All attempts are charged, booked or given; only the last one is evidence.
func TestAttemptsInTheBooks(t *testing.T) {
	of := func(n int, outcome record.Outcome) sketch {
		one := attempt(n, outcome)
		one.open.Commit = strings.Repeat("b", 40)
		return one
	}
	s := sceneOf(of(2, record.OK)).onCommit("b")
	s.books = append(bookedNights(3, 1, ranOn("a")), bookedAs("main", of(1, record.Failed)))
	s.policy = monthly("1 kg", "")
	st := s.judge(t)
	assert.Equal(t, budget.Open, st.Gate, st.Reason)
	assert.InDelta(t, 500, spentIn(t, st), 2)
	require.Len(t, st.Changes, 1)
	assert.Equal(t, []int{3, 1}, []int{st.Changes[0].BaseRuns, st.Changes[0].HeadRuns})
	s.books = s.books[:3] // the first attempt is not booked
	assert.Contains(t, strings.Join(doubts(s.judge(t)), "\n"), "attempt 2")
}

// The energy lines of a run must not be charged again under another name, in
// whatever account either is.
func TestCopyInTheBooks(t *testing.T) {
	for _, account := range []string{"main", "pull/3", "harbour-works"} {
		for _, given := range []bool{true, false} {
			s := sceneOf().onCommit("b")
			again := night(ranOn("b"), called("again.ndjson", "n2"), func(s *sketch) { s.open.Host = "mole-9" })
			s.books = []booked{bookedAs(account, night(ranOn("a")))}
			if given {
				s.head = []sketch{again}
			} else {
				s.books = append(s.books, bookedAs("main", again))
			}
			s.policy = monthly("1 kg", "")
			st := s.judge(t)
			assert.Equal(t, budget.Closed, st.Gate, "%s, %v", account, given)
			assert.Contains(t, strings.Join(doubts(st), "\n"), "the same energy lines", "%s, %v", account, given)
		}
	}
}

// A part that is booked and given with other content is in doubt, naming both.
func TestGivenContradictsBooked(t *testing.T) {
	s := sceneOf(night(ranOn("b"), scaled(0.5))).onCommit("b")
	s.books = append(bookedNights(3, 1, ranOn("a")), bookedAs("main", night(ranOn("b"))))
	s.policy = monthly("1 kg", "")
	st := s.judge(t)
	assert.Equal(t, budget.Unproven, ruling(t, st, "one training").State)
	assert.Equal(t, budget.Unproven, ruling(t, st, "month").State)
	assert.Contains(t, strings.Join(doubts(st), "\n"), "night.ndjson")
	assert.Contains(t, strings.Join(doubts(st), "\n"), "of the books")
	// What the books had before this change is spent all the same.
	s.policy = monthly("299 g", "")
	assert.Equal(t, budget.Over, ruling(t, s.judge(t), "month").State)
}

// A doubt about a run of another day says nothing about this day's sum.
func TestDoubtOutsideThePeriod(t *testing.T) {
	thin := night(ranOn("b"), called("thin.ndjson", "n0"), later(-unit.Day), func(s *sketch) { s.hole = [2]unit.Duration{10 * unit.Minute, 50 * unit.Minute} })
	for _, given := range []bool{true, false} {
		s := sceneOf(night(ranOn("b"))).onCommit("b")
		if given {
			s.head = append(s.head, thin)
			s.keeps = true
		} else {
			s.books = []booked{bookedAs("main", thin)}
		}
		s.policy = daily("1 kg", "")
		r := ruling(t, s.judge(t), "month")
		assert.Equal(t, budget.Within, r.State, "given %v: %s", given, r.Reason)
		assert.InDelta(t, 100, *r.Observed, 1e-9)
	}
}

// numbers are what a statement rules, compares and charges, without words that
// tell where a run was read.
func numbers(t test, st *budget.Statement) (lines []string) {
	for _, r := range st.Rulings {
		v := "none"
		if r.Observed != nil {
			v = fmt.Sprintf("%.9g", *r.Observed)
		}
		if r.Per != "" && r.Per != "run" && len(doubts(st)) > 0 {
			continue // what of a sum is proven has tests of its own
		}
		if r.Per != "" && r.Per != "run" && r.State == budget.Near {
			r.State = budget.Within // so has where the period lands
		}
		lines = append(lines, fmt.Sprintf("%s %s %s: %s %s", r.Kind, r.Name, r.Job, r.State, v))
	}
	for _, r := range st.Runs {
		total := "none"
		if r.Total != nil {
			total = fmt.Sprintf("%.9g", float64(*r.Total))
		}
		lines = append(lines, fmt.Sprintf("%s %d %s %s %s", r.Run, r.Attempt, r.Side, r.Outcome, total))
	}
	slices.Sort(lines)
	return append(lines, string(st.Gate))
}

// spans are budgets over time for the drawn cases.
const spans = `
[[budget]]
name = "the day"
limit = "300 g"
per = "day"
[[budget]]
name = "energy of the month"
limit = "1 kWh"
per = "month"
[[budget]]
name = "rate of the week"
limit = "100 g per 1000 step"
per = "week"
`

// A record with a line that cannot count is the same record in the books.
func TestBadLineGivenAndBooked(t *testing.T) {
	bad := night(ranOn("b"), func(s *sketch) { s.lines = []string{`{"k":"power","meter":"gpu0","w":-1}`} })
	s := sceneOf(bad).onCommit("b")
	s.policy = edit(t, plain, `"150 g"`, `"90 g"`)
	alone := ruling(t, s.judge(t), "one training")
	assert.Equal(t, budget.Over, alone.State, "what can be read is proven")
	s.books = []booked{bookedAs("main", bad)}
	both := s.judge(t)
	assert.Equal(t, budget.Over, ruling(t, both, "one training").State)
	assert.NotContains(t, strings.Join(doubts(both), "\n"), "different content")
}

// Judging from the books is judging the same records from files.
func TestBooksEqualFiles(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d := drawCase(t)
		s := &scene{policy: d.policy + spans, series: d.series, about: sceneOf().about, keeps: true}
		p, set := policyOf(t, s.policy), seriesOf(t, s.series)
		for _, one := range d.records {
			part := weigh(t, p, set, one.file, one.text(t))
			_, err := p.Entry(part, budget.Booking{Branch: "main", Now: now})
			switch {
			case err != nil, !p.Knows(one.open.Job), now.Sub(part.End) > p.Evidence.MaxAge:
				continue // cannot be booked, or is no head run of a branch
			case part.End > now, part.Findings.Len() > 0:
				continue // not over yet; has a test of its own
			}
			s.head = append(s.head, one)
		}
		files := numbers(t, s.judge(t))
		for _, one := range s.head {
			s.books = append(s.books, bookedAs("main", one))
		}
		both := numbers(t, s.judge(t))
		s.head = nil
		assert.Equal(t, files, numbers(t, s.judge(t)), "booked\n%s", s.policy)
		assert.Equal(t, files, both, "booked and given")
	})
}
