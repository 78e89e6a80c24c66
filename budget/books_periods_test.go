package budget_test

import (
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/unit"
)

// instant reads a time as RFC 3339.
func instant(t test, text string) unit.Instant {
	t.Helper()
	at, err := time.Parse(time.RFC3339, text)
	require.NoError(t, err)
	return unit.At(at)
}

// allYear is steady for a whole year and the end of the one before.
const allYear = `zone,from,to,g_per_kwh,factor
NORTH,2030-10-01T00:00:00Z,2032-03-01T00:00:00Z,100,average
SOUTH,2030-10-01T00:00:00Z,2032-03-01T00:00:00Z,200,average
`

// lasting makes the run last so long.
func lasting(d unit.Duration) func(*sketch) { return func(s *sketch) { s.length = d } }

// startedAt moves the run to a start.
func startedAt(when unit.Instant) func(*sketch) { return func(s *sketch) { s.open.At = when } }

// bookedOver is a scene in whose books is one run of 100 g/h.
func bookedOver(t test, from string, length unit.Duration, per, zone string) *scene {
	s := sceneOf()
	s.series = allYear
	s.policy = edit(t, monthly("1 t", ""), `per = "month"`, `per = "`+per+`"`, "[account]\n", "[account]\ntimezone = \""+zone+"\"\n")
	s.books = []booked{bookedAs("main", night(startedAt(instant(t, from)), lasting(length)))}
	return s
}

// The day on which clocks go forward is 23 hours long, the one on which they go
// back 25: by the clocks of Berlin they change at 01:00 UTC on the last Sundays
// of March and October (Directive 2000/84/EC).
func TestDaysOfOddLength(t *testing.T) {
	for _, c := range []struct {
		day, from string // a run from two hours before the day to a minute before its end
		hours     float64
		zone      string
	}{
		{"2031-03-30", "2031-03-29T21:00:00Z", 23, "Europe/Berlin"},
		{"2031-10-26", "2031-10-25T20:00:00Z", 25, "Europe/Berlin"},
		{"2031-10-26", "2031-10-25T22:00:00Z", 24, "UTC"},
		{"2031-04-06", "2031-04-05T11:00:00Z", 24.5, "Australia/Lord_Howe"}, // half an hour back
	} {
		s := bookedOver(t, c.from, unit.Duration((c.hours+2)*float64(unit.Hour))-unit.Minute, "day", c.zone)
		s.about.Now = instant(t, c.from).Add(unit.Duration((c.hours + 2) * float64(unit.Hour))).Add(-1)
		st := s.judge(t)
		require.Len(t, st.Accounts, 2)
		assert.Equal(t, c.day, st.Accounts[1].Period)
		assert.InDelta(t, 100*(c.hours-1.0/60), grams(t, st.Accounts[1].Carried), 1e-3, "%+v", c)
	}
}

// A run over the edge of a period is spent in either by the hours, embodied
// emissions by time: 1000 kg over 4 years are 28.5388 g an hour (ISO/IEC
// 21031:2024).
func TestRunOverTheEdge(t *testing.T) {
	for _, c := range []struct{ per, from, now, period string }{
		{"day", "2031-03-09T21:00:00Z", "2031-03-10T06:00:00Z", "2031-03-10"},
		{"week", "2031-03-09T21:00:00Z", "2031-03-12T06:00:00Z", "2031-W11"}, // from Monday, ISO 8601
		{"month", "2031-03-31T21:00:00Z", "2031-04-02T06:00:00Z", "2031-04"},
		{"quarter", "2031-06-30T21:00:00Z", "2031-07-10T06:00:00Z", "2031-Q3"},
		{"year", "2030-12-31T21:00:00Z", "2031-01-02T06:00:00Z", "2031"},
	} {
		for _, limit := range []string{"1 t", "1 MWh"} {
			s := bookedOver(t, c.from, 5*unit.Hour, c.per, "UTC")
			s.policy = edit(t, s.policy, "meters = 4\n", "meters = 4\nembodied = \"1000 kg\"\nlifetime = \"4y\"\n", `"1 t"`, `"`+limit+`"`)
			s.about.Now = instant(t, c.now)
			st := s.judge(t)
			want := 2 * (100 + 6250/219.)
			if limit == "1 MWh" {
				want = 2
			} else {
				assert.Equal(t, c.period, st.Accounts[1].Period)
			}
			assert.InDelta(t, want, spentIn(t, st), 1e-6, "%+v", c)
		}
	}
}

// What is charged to another branch or a pull request is theirs.
func TestAccountsAreApart(t *testing.T) {
	s := sceneOf()
	s.books = bookedNights(3, 1)
	for _, account := range []string{"pull/7", "harbour-works", "main/old"} {
		s.books = append(s.books, bookedAs(account, night(called("x", account), scaled(5))))
	}
	s.policy = monthly("1 t", "")
	assert.InDelta(t, 300, spentIn(t, s.judge(t)), 1e-9)
}

// The rate of a period that a pull request is judged beside is that of the
// branch: the pull request's runs are charged to it alone, given or booked.
func TestRateBesidePullRequest(t *testing.T) {
	for _, given := range []bool{true, false} {
		s := sceneOf().onCommit("b")
		s.about.Pull = 7
		s.books = bookedNights(4, 1, ranOn("a"))
		heavy := night(ranOn("b"), scaled(4))
		if given {
			s.head = []sketch{heavy}
		} else {
			s.books = append(s.books, bookedAs("pull/7", heavy))
		}
		s.policy = monthly("150 g per 1000 step", "")
		r := ruling(t, s.judge(t), "month")
		assert.InDelta(t, 0.1, *r.Observed, 1e-12, "given %v", given)
		assert.Equal(t, budget.Within, r.State)
	}
}

// Of a rate, too, nothing is known that lies ahead of the clock.
func TestRateKnowsNoFuture(t *testing.T) {
	s := sceneOf()
	s.about.Now = now.Add(-2 * unit.Day)
	s.books = bookedNights(6, 0)
	s.books[5].sketch = scaledOf(s.books[5].sketch, 10)
	s.policy = monthly("150 g per 1000 step", "")
	r := ruling(t, s.judge(t), "month")
	assert.InDelta(t, 0.1, *r.Observed, 1e-12)
}

func scaledOf(s sketch, by float64) sketch { scaled(by)(&s); return s }

// A run that did no work emits all the same: a rate over several runs is the
// sum of g by the sum of work. K: 100 g/10 and 100 g/90 are 2 g each.
func TestRateIsQuotientOfSums(t *testing.T) {
	s := sceneOf()
	s.books = bookedNights(2, 0)
	s.books[0].work[0].Done, s.books[1].work[0].Done = 10, 90
	s.policy = edit(t, monthly("3 g per step", ""), `"150 g"`, `"1 t"`)
	assert.InDelta(t, 2, *ruling(t, s.judge(t), "month").Observed, 1e-12)
	s.books[0].work[0].Unit = "epoch"
	r := ruling(t, s.judge(t), "month")
	assert.Equal(t, budget.Unproven, r.State)
	assert.Contains(t, r.Reason, "epoch")
	assert.Contains(t, r.Reason, "step")
}

// An energy does not depend on its price: where a night has none, its energy is
// spent and known.
func TestEnergyWithoutPrice(t *testing.T) {
	for _, given := range []bool{true, false} {
		s := sceneOf()
		s.series = header + row(-9*24*60, -30*60, "100") + row(-20*60, 12*60, "100") // a hole over one night
		s.books = bookedNights(4, 0)
		if given {
			s.books, s.head = s.books[:3], []sketch{s.books[3].sketch}
		}
		s.policy = monthly("100 kWh", "")
		r := ruling(t, s.judge(t), "month")
		assert.InDelta(t, 4, *r.Observed, 1e-9)
		assert.Equal(t, budget.Within, r.State, r.Reason)
		s.policy = monthly("1 kg", "")
		assert.Equal(t, budget.Unproven, ruling(t, s.judge(t), "month").State, "a mass does depend on it")
	}
}

// A thin record does not become evidence by growing old; what fills its gaps is
// not proven.
func TestThinNightStaysThin(t *testing.T) {
	for _, back := range []int{1, 6} {
		s := sceneOf(night())
		s.books = bookedNights(3, back)
		s.books[2].hole = [2]unit.Duration{10 * unit.Minute, 50 * unit.Minute}
		s.policy = monthly("1 kg", "")
		assert.Equal(t, budget.Unproven, ruling(t, s.judge(t), "month").State, "%d nights ago", back)
		s.policy = monthly("350 g", "") // 333 g are measured, 67 g fill the gap
		assert.Equal(t, budget.Unproven, ruling(t, s.judge(t), "month").State, "%d nights ago", back)
		s.policy = monthly("330 g", "")
		assert.Equal(t, budget.Over, ruling(t, s.judge(t), "month").State, "%d nights ago", back)
	}
}
