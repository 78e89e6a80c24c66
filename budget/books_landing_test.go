package budget_test

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
)

// lands is the named budget's landing in the n-th period from the current one.
func lands(t test, st *budget.Statement, n int) budget.Landing {
	t.Helper()
	require.Greater(t, len(st.Landings), n)
	return st.Landings[n]
}

// On a push the head run is part of where the month lands, whether it is booked
// yet or not: ten nights are taken by March 10th at noon, and 21 are left. The
// window of the tenth firing has passed.
func TestLandingOnPush(t *testing.T) {
	for _, given := range []bool{true, false} {
		for _, limit := range []string{"10 kg", "100 kWh"} {
			s := sceneOf().onCommit("b")
			s.series = allYear
			s.policy = edit(t, scheduled(t, monthly(limit, "")), "schedule =", "window = \"9h\"\nschedule =")
			s.books = bookedNights(9, 1, ranOn("a"))
			if given {
				s.head = []sketch{night(ranOn("b"))}
			} else {
				s.books = append(s.books, bookedAs("main", night(ranOn("b"))))
			}
			l := lands(t, s.judge(t), 0)
			assert.InDelta(t, 21, l.RunsLeft, 1e-9, "given %v, %s", given, limit)
			// A tenth of the limit in 9.5 of 31 days.
			assert.InDelta(t, 0.1/(9.5/31), *l.BurnRatio, 1e-6, "given %v", given)
			if limit == "100 kWh" {
				assert.Nil(t, l.Expected)
				require.NotNil(t, l.ExpectedE)
				assert.InDelta(t, 31, float64(*l.ExpectedE), 1e-6, "given %v", given)
				continue
			}
			assert.InDelta(t, 3100, grams(t, l.Expected), 1e-6, "given %v", given)
			assert.InDelta(t, 1000, grams(t, l.Spent), 1e-6, "given %v", given)
		}
	}
}

// A firing is left until its run is booked or its window has passed: at noon
// the one of 02:00 is left by a window of ten hours, not by one of nine.
func TestWindowOfFiring(t *testing.T) {
	for window, left := range map[string]float64{"10h": 22, "9h": 21} {
		s := sceneOf()
		s.about.Pull, s.series = 7, allYear
		s.policy = edit(t, scheduled(t, monthly("1 t", "")), "schedule =", "window = \""+window+"\"\nschedule =")
		s.books = bookedNights(9, 1)
		assert.InDelta(t, left, lands(t, s.judge(t), 0).RunsLeft, 1e-9, window)
	}
}

// An unscheduled job goes on as it did: nine runs in the 9 d 10 h that the books
// reach back, 21.5 days to go; N d/D.
func TestUnscheduledJobLands(t *testing.T) {
	s := sceneOf()
	s.about.Pull, s.series, s.policy = 7, allYear, monthly("1 t", "")
	s.books = bookedNights(9, 1)
	st := s.judge(t)
	left := 9 * 21.5 / (9 + 10/24.)
	assert.InDelta(t, left, lands(t, st, 0).RunsLeft, 1e-9)
	assert.InEpsilon(t, 900+100*left, grams(t, lands(t, st, 0).Expected), 1e-9)
	assert.InEpsilon(t, 100*30*9/(9+10/24.), grams(t, lands(t, st, 1).Expected), 1e-9, "all of April")
}

// prospect is a change on main that takes so much, limit and landing given; a
// merge group is judged like the pull request.
func prospect(t test, by float64, limit, landing string, group bool) *budget.Statement {
	s := inPull(scheduled(t, monthly(limit, "landing = \""+landing+"\"\n")), 9, night(scaled(by)))
	s.policy = edit(t, s.policy, `"150 g"`, `"1 t"`)
	if group {
		s.about.Pull, s.about.MergeGroup = 0, true
	}
	return s.judge(t)
}

// A change closes the gate by a period only if it raises where the period lands
// and the policy says so. 9 nights are spent, 22 are left, 30 come in April.
func TestProspectOfPeriod(t *testing.T) {
	for _, group := range []bool{true, false} {
		for _, c := range []struct {
			by             float64
			limit, landing string
			want           budget.State
		}{
			{1, "3.1 kg", "close", budget.Within},      // exactly at the limit
			{1, "3.09 kg", "close", budget.Near},       // over without it too, and it raises nothing
			{0.5, "2 kg", "close", budget.Near},        // 900 + 22 x 50 = 2000; April 1500
			{0.5, "1.9 kg", "close", budget.Near},      // lowers it
			{0.5, "890 g", "close", budget.Near},       // what others spent
			{1.5, "4.4 kg", "close", budget.Over},      // 4200 in March, 4500 in April
			{1.5, "4.4 kg", "warn", budget.Near},       //
			{1.5, "4.5 kg", "close", budget.Within},    //
			{1.5, "4.19 kg", "warn", budget.Near},      //
			{1.5, "890 g", "warn", budget.Near},        //
			{0.9, "2.881 kg", "close", budget.Within},  // 900 + 22 x 90 = 2880
			{1.02, "3.143 kg", "close", budget.Over},   // 3144 in March, 3060 in April
			{1.02, "3.145 kg", "close", budget.Within}, //
		} {
			st := prospect(t, c.by, c.limit, c.landing, group)
			r := ruling(t, st, "month")
			if c.by == 0.5 && c.limit == "2 kg" {
				assert.NotEqual(t, budget.Over, r.State, "%+v: %s", c, r.Reason)
			} else {
				assert.Equal(t, c.want, r.State, "group %v, %+v: %s", group, c, r.Reason)
			}
			assert.InEpsilon(t, 900+22*100*c.by, grams(t, lands(t, st, 0).Expected), 1e-6)
			assert.InEpsilon(t, 30*100*c.by, grams(t, lands(t, st, 1).Expected), 1e-6)
			assert.InEpsilon(t, 3100, grams(t, lands(t, st, 0).Without), 1e-6)
			assert.Equal(t, c.want == budget.Over, st.Gate == budget.Closed, "%+v: %s", c, st.Reason)
		}
	}
	st := prospect(t, 0.5, "890 g", "close", false)
	assert.Equal(t, "over before this change", ruling(t, st, "month").Reason)
	assert.Len(t, prospect(t, 1, "4 kg", "close", true).Accounts, 2)
}

// A job that is new with the change comes on top: 50 g every night.
func TestNewJobLands(t *testing.T) {
	fresh := night(scored, scaled(0.5))
	s := inPull(scheduled(t, monthly("4 kg", "landing = \"close\"\n")), 9, night(), fresh)
	s.policy += "\n[[job]]\nname = \"score-tide\"\nschedule = \"0 3 * * *\"\nwindow = \"1h\"\n"
	s.books = append(s.books, bookedAs("pull/7", fresh))
	st := s.judge(t)
	assert.InEpsilon(t, 3100+21*50, grams(t, lands(t, st, 0).Expected), 1e-6)
	assert.InEpsilon(t, 30*150, grams(t, lands(t, st, 1).Expected), 1e-6)
	assert.Equal(t, budget.Over, ruling(t, st, "month").State)
}

// Extra mass lifts the limit where a period lands, too, up to its last day in
// the policy's zone; a rule that is not named is not waived.
func TestWaiverOfLanding(t *testing.T) {
	for extra, want := range map[string]budget.State{"200 g": budget.Waived, "90 g": budget.Over} {
		s := inPull(scheduled(t, monthly("4.4 kg", "landing = \"close\"\n")), 9, night(scaled(1.5)))
		s.policy = edit(t, s.policy, `"150 g"`, `"1 t"`) + "\n[[waiver]]\nrule = \"month\"\nreason = \"backfill\"\napproved_by = \"@quay-lead\"\nexpires = 2031-04-30\nextra = \"" + extra + "\"\n"
		st := s.judge(t)
		assert.Equal(t, want, ruling(t, st, "month").State)
		for _, l := range st.Landings {
			assert.False(t, want == budget.Waived && l.State == budget.Over, "%s: %s is %s", extra, l.Period, l.State)
		}
		s.policy = strings.Replace(s.policy, `rule = "month"`, `rule = "one training"`, 1)
		assert.Equal(t, budget.Over, ruling(t, s.judge(t), "month").State)
		s.policy = strings.Replace(s.policy, `rule = "one training"`, `rule = "month"`, 1)
		s.policy = strings.Replace(s.policy, "2031-04-30", "2031-03-09", 1)
		assert.Equal(t, budget.Over, ruling(t, s.judge(t), "month").State, "expired")
	}
}

// A release ends with no date: a pull request is told only what others spent.
func TestReleaseBeforeMerge(t *testing.T) {
	s := inPull(edit(t, monthly("800 g", "landing = \"close\"\n"), `per = "month"`, `per = "release"`), 9, night())
	r := ruling(t, s.judge(t), "month")
	assert.Equal(t, []any{budget.Near, "over before this change"}, []any{r.State, r.Reason})
	assert.InDelta(t, 900, *r.Observed, 1e-9)
	s.about.Pull = 0
	s.books = append(s.books, bookedAs("main", s.head[0]))
	assert.Equal(t, budget.Over, ruling(t, s.judge(t), "month").State, "on the branch it is spent")
	assert.InDelta(t, 1000, spentIn(t, s.judge(t)), 1e-9)
}
