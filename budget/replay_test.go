package budget_test

import (
	"fmt"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/unit"
)

// replayed replays the scene's books by its policy, and by another beside it.
func (s *scene) replayed(t test, beside string) *budget.Replay {
	t.Helper()
	p, set := policyOf(t, s.policy), seriesOf(t, s.series)
	var other *budget.Replayed
	if beside != "" {
		other = &budget.Replayed{Policy: policyOf(t, beside), Set: set, Source: "head"}
	}
	return budget.NewReplay(s.ledger(t, p, set), s.about, budget.Replayed{Policy: p, Set: set, Source: "target"}, other)
}

// letter is the commit of the n-th night, counted back.
func letterOf(n int) string { return string(rune('a' + n)) }

// nightsOf are nights on main, each on a commit of its own, taking so much.
func nightsOf(powers ...float64) *scene {
	s := sceneOf()
	s.series = allYear
	for n, by := range powers {
		back := len(powers) - 1 - n
		one := bookedNights(1, back, ranOn(letterOf(back)), scaled(by))[0]
		s.books = append(s.books, one)
	}
	return s
}

// gates are the verdicts in order of time.
func gates(r *budget.Replay) (list []budget.Gate) {
	for _, c := range r.Changes {
		list = append(list, c.Gate)
	}
	return list
}

// Each night is judged by what was known when it ended: the month closes with
// the night that passes its limit, and stays closed.
func TestReplayIsOfItsTime(t *testing.T) {
	s := nightsOf(1, 1, 1.6, 1, 1) // the third alone is over 150 g
	r := s.replayed(t, "")
	assert.Equal(t, []budget.Gate{"open", "open", "closed", "open", "open"}, gates(r))
	s.policy = strings.Replace(monthly("350 g", ""), `"150 g"`, `"1 t"`, 1)
	r = s.replayed(t, "")
	assert.Equal(t, []budget.Gate{"open", "open", "closed", "closed", "closed"}, gates(r))
	assert.Equal(t, []int{2, 3, 0}, []int{r.Policy.Open, r.Policy.Closed, r.Policy.Unproven})
	assert.Equal(t, map[string]int{"month": 3}, r.Policy.Days)
	for n, c := range r.Changes {
		assert.Equal(t, two.Add(-unit.Duration(4-n)*unit.Day+unit.Hour), c.At)
		assert.Equal(t, strings.Repeat(letterOf(4-n), 40), c.Commit)
		assert.Equal(t, c.Gate == budget.Closed, len(c.Reasons) > 0)
	}
}

// What the books got later changes no verdict of before.
func TestReplaySeesNothingLater(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(2, 7).Draw(t, "nights")
		var powers []float64
		for k := range n {
			powers = append(powers, rapid.SampledFrom([]float64{0.8, 1, 1.1, 1.4, 1.6, 3}).Draw(t, "power")+float64(k)/1000)
		}
		s := nightsOf(powers...)
		limit := rapid.SampledFrom([]string{"300 g", "500 g", "150 g per 1000 step", "4 kWh"}).Draw(t, "limit")
		per := rapid.SampledFrom([]string{"day", "week", "month", "release"}).Draw(t, "per")
		s.policy = strings.Replace(monthly(limit, ""), `per = "month"`, `per = "`+per+`"`, 1) + "\n[[regression]]\nname = \"no creep\"\nmax_rise = \"5%\"\n"
		for k := range s.books {
			if rapid.IntRange(0, 3).Draw(t, "pull?") == 0 {
				s.books[k].account = "pull/7"
			}
		}
		whole := s.replayed(t, "")
		s.books = s.books[:n-1]
		less := s.replayed(t, "")
		require.Len(t, less.Changes, n-1)
		assert.Equal(t, less.Changes, whole.Changes[:n-1])
	})
}

// A run that was still going on when a change was judged is not seen: it was
// booked when it had ended.
func TestReplayOfRunGoingOn(t *testing.T) {
	s := nightsOf(1, 1)
	s.policy = strings.Replace(monthly("250 g", ""), `"150 g"`, `"1 t"`, 1)
	s.books = append(s.books, bookedAs("main", night(called("long", "long"), startedAt(two.Add(-unit.Hour)), lasting(6*unit.Hour), ranOn("z"), func(s *sketch) { s.open.Host = "mole-9" })))
	for _, c := range s.replayed(t, "").Changes {
		want := budget.Open
		if strings.HasPrefix(c.Commit, "z") {
			want = budget.Closed
		}
		assert.Equal(t, want, c.Gate, "commit %.1s at %s", c.Commit, c.At)
	}
}

// A pull request has one change for each commit, a branch one for each commit
// and day; other branches and what tells no commit are left out.
func TestReplayFindsChanges(t *testing.T) {
	s := nightsOf(1, 1, 1)
	ranOn("q")(&s.books[0].sketch)
	ranOn("q")(&s.books[1].sketch) // two nights on one commit
	for n, account := range []string{"pull/7", "pull/7", "pull/8", "harbour-works"} {
		one := bookedAs(account, night(called("x", fmt.Sprint("x", n)), later(unit.Duration(n+2)*unit.Hour), ranOn(letterOf(n+10)), scaled(1+float64(n)/100)))
		s.books = append(s.books, one)
	}
	bare := bookedAs("main", night(called("y", "y"), later(-9*unit.Day), scaled(0.9)))
	s.books = append(s.books, bare)
	r := s.replayed(t, "")
	var pulls []int
	for _, c := range r.Changes {
		pulls = append(pulls, c.Pull)
	}
	assert.Equal(t, []int{0, 0, 0, 7, 7, 8}, pulls)
	assert.Contains(t, strings.Join(r.Notes, "\n"), "1 parts of runs tell no commit")
	s.about.Now = two.Add(-unit.Day + 2*unit.Hour)
	assert.Len(t, s.replayed(t, "").Changes, 2, "as of the clock")
}

// A policy that is tried is told beside the one in force, where it differs.
func TestReplayBeside(t *testing.T) {
	s := nightsOf(1, 1, 1, 1.6)
	tried := edit(t, s.policy, `"150 g"`, `"170 g"`)
	r := s.replayed(t, tried)
	require.NotNil(t, r.Beside)
	assert.Equal(t, []any{"target", 3, 1, 0}, []any{r.Policy.Source, r.Policy.Open, r.Policy.Closed, r.Policy.Unproven})
	assert.Equal(t, []any{"head", 4, 0, 0}, []any{r.Beside.Source, r.Beside.Open, r.Beside.Closed, r.Beside.Unproven})
	d := r.Differences()
	require.Len(t, d.Changes, 1)
	assert.Equal(t, budget.Closed, d.Changes[0].Gate)
	assert.Equal(t, budget.Open, d.Changes[0].Beside.Gate)
	assert.Len(t, r.Changes, 4, "the whole is not touched")
	assert.Empty(t, s.replayed(t, s.policy).Differences().Changes)
	assert.Nil(t, (&scene{policy: plain, series: steady, about: s.about}).replayed(t, tried).Differences())
}

// Days over are counted on the days of the policy's zone; a release that was
// marked in between opens a new account.
func TestDaysOver(t *testing.T) {
	s := nightsOf(1, 1, 3, 1, 1)
	s.policy = daily("190 g", "") + "\n[[budget]]\nname = \"release\"\nlimit = \"450 g\"\nper = \"release\"\n"
	r := s.replayed(t, "")
	assert.Equal(t, map[string]int{"month": 1, "release": 3}, r.Policy.Days)
	s.marks = []*ledger.Mark{{Kind: ledger.KindRelease, Tag: "v1", Branch: "main", At: two.Add(-unit.Day - unit.Hour)}}
	assert.Equal(t, map[string]int{"month": 1, "release": 1}, s.replayed(t, "").Policy.Days)
	s.policy = edit(t, s.policy, "[account]\n", "[account]\ntimezone = \"America/Caracas\"\n") // four hours behind
	for n := range s.books {
		s.books[n].open.At = s.books[n].open.At.Add(90 * unit.Minute) // cut at its midnight, 04:00 UTC
	}
	assert.Equal(t, map[string]int{"month": 2}, s.replayed(t, "").Policy.Days, "150 g on either day, and 50 g of the night beside")
}

// What evidence alone closes is counted as unproven.
func TestReplayUnproven(t *testing.T) {
	s := nightsOf(1, 1)
	s.books[1].hole = [2]unit.Duration{10 * unit.Minute, 50 * unit.Minute}
	r := s.replayed(t, "")
	assert.Equal(t, []int{1, 0, 1}, []int{r.Policy.Open, r.Policy.Closed, r.Policy.Unproven})
	assert.Contains(t, strings.Join(r.Changes[1].Reasons, "\n"), "coverage")
	s.policy = edit(t, s.policy, `unproven = "close"`, `unproven = "warn"`)
	assert.Equal(t, 2, s.replayed(t, "").Policy.Open)
}
