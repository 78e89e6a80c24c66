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

// forecast is where the scene's periods land, and whether a job's next run fits.
func (s *scene) forecast(t test, job string) *budget.Forecast {
	t.Helper()
	p, set := policyOf(t, s.policy), seriesOf(t, s.series)
	c := s.about
	c.Books = p.Books(s.ledger(t, p, set), set)
	return p.Forecast(c, job)
}

// tenNights have spent 1 kg and 10 kWh of March; 21 nights are left, 30 come in
// April.
func tenNights(t test, limit, more string) *scene {
	s := sceneOf()
	s.series, s.books = allYear, bookedNights(10, 0)
	s.policy = scheduled(t, monthly(limit, more))
	return s
}

func TestForecastOfMonths(t *testing.T) {
	for _, c := range []struct {
		limit     string
		now, then budget.State
	}{
		{"3.1 kg", budget.Within, budget.Within},
		{"3.05 kg", budget.Near, budget.Within},
		{"2.9 kg", budget.Near, budget.Near},
		{"1 kg", budget.Near, budget.Near},  // exactly spent
		{"999 g", budget.Over, budget.Near}, // spent, and April is not yet
		{"31 kWh", budget.Within, budget.Within},
		{"9.9 kWh", budget.Over, budget.Near},
	} {
		f := tenNights(t, c.limit, "").forecast(t, "")
		require.Len(t, f.Landings, 2)
		assert.Equal(t, []string{"2031-03", "2031-04"}, []string{f.Landings[0].Period, f.Landings[1].Period})
		assert.Equal(t, []budget.State{c.now, c.then}, []budget.State{f.Landings[0].State, f.Landings[1].State}, c.limit)
		assert.InDelta(t, 21, f.Landings[0].RunsLeft, 1e-9)
		assert.InDelta(t, 30, f.Landings[1].RunsLeft, 1e-9)
		if strings.HasSuffix(c.limit, "kWh") {
			assert.InDelta(t, 31, float64(*f.Landings[0].ExpectedE), 1e-9)
			assert.InDelta(t, 30, float64(*f.Landings[1].ExpectedE), 1e-9)
			continue
		}
		assert.InDelta(t, 3100, grams(t, f.Landings[0].Expected), 1e-6)
		assert.InDelta(t, 3000, grams(t, f.Landings[1].Expected), 1e-6)
		assert.Nil(t, f.Landings[0].Without, "there is no change")
		assert.Nil(t, f.Fits, "no job was asked for")
	}
}

// The firing by which what is expected passes the limit: the 13th night after
// the ten, on the 23rd.
func TestForecastRunsOut(t *testing.T) {
	l := tenNights(t, "2.25 kg", "").forecast(t, "").Landings[0]
	require.NotNil(t, l.RunsOutOn)
	assert.Equal(t, instant(t, "2031-03-23T02:00:00Z"), *l.RunsOutOn)
	assert.InEpsilon(t, 1000/2250./(9.5/31), *l.BurnRatio, 1e-9)
}

// A run is charged in the hours it takes: the day that begins within it gets
// its share, and the next whole day lands at one night.
func TestForecastOfDays(t *testing.T) {
	s := tenNights(t, "1 kg", "")
	s.policy = strings.Replace(s.policy, `per = "month"`, `per = "day"`, 1)
	f := s.forecast(t, "")
	assert.InDelta(t, 100, grams(t, f.Landings[0].Spent), 1e-9)
	assert.InDelta(t, 100, grams(t, f.Landings[0].Expected), 1e-9)
	assert.Equal(t, "2031-03-11", f.Landings[1].Period)
	assert.InDelta(t, 0, grams(t, f.Landings[1].Spent), 1e-9)
	assert.InDelta(t, 100, grams(t, f.Landings[1].Expected), 1e-9)
}

// Whether one more run fits what is left, now. Exactly at the limit fits.
func TestNextRunFits(t *testing.T) {
	for limit, fits := range map[string]bool{
		"1.1 kg": true, "1.2 kg": true, "1.099 kg": false, "1 kg": false, "900 g": false, "11 kWh": true, "10.9 kWh": false,
	} {
		f := tenNights(t, limit, "").forecast(t, "retrain-tide")
		if assert.NotNil(t, f.Fits, limit) {
			assert.Equal(t, fits, *f.Fits, "%s: %v", limit, f.Reasons)
			assert.Equal(t, fits, len(f.Reasons) == 0, limit)
		}
	}
	s := tenNights(t, "1.05 kg", "")
	s.policy += "\n[[budget]]\nname = \"wide\"\nlimit = \"1 t\"\nper = \"year\"\n"
	f := s.forecast(t, "retrain-tide")
	assert.False(t, *f.Fits, "one budget that it does not fit is enough")
	require.Len(t, f.Reasons, 1)
	assert.Contains(t, f.Reasons[0], "month")
	assert.Len(t, f.Landings, 4)
	s.policy = strings.Replace(s.policy, "branch = \"main\"\nlimit", "branch = \"harbour-works\"\nlimit", 1)
	assert.True(t, *s.forecast(t, "retrain-tide").Fits, "another branch's budget")
}

// Of a job without a past run, or that no budget is about, nothing is known;
// that is not zero.
func TestNextRunIsNotKnown(t *testing.T) {
	s := tenNights(t, "2 kg", "")
	s.policy += "\n[[job]]\nname = \"score-tide\"\n"
	f := s.forecast(t, "score-tide")
	assert.Nil(t, f.Fits)
	assert.Contains(t, strings.Join(f.Reasons, "\n"), "no past run of score-tide")
	s.policy = strings.Replace(s.policy, "\"2 kg\"", "\"900 g\"", 1)
	assert.False(t, *s.forecast(t, "score-tide").Fits, "nothing fits what is spent")
}

// Extra mass stays until its waiver expires.
func TestForecastWithWaiver(t *testing.T) {
	waiver := "\n[[waiver]]\nrule = \"month\"\nreason = \"backfill\"\napproved_by = \"@quay-lead\"\nextra = \"200 g\"\nexpires = "
	s := tenNights(t, "950 g", waiver+"2031-03-10\n")
	f := s.forecast(t, "retrain-tide")
	assert.True(t, *f.Fits, "1.1 of 1.15 kg: %v", f.Reasons)
	assert.InDelta(t, 1150, grams(t, f.Landings[0].Limit), 1e-9)
	s = tenNights(t, "950 g", waiver+"2031-03-09\n")
	assert.False(t, *s.forecast(t, "retrain-tide").Fits)
}

// Failed nights are spent and say nothing of the next; no later night is seen.
func TestForecastOfEvidence(t *testing.T) {
	s := tenNights(t, "9 kg", "")
	s.books[3].sketch = scaledOf(s.books[3].sketch, 6)
	s.books[3].outcome = "failed"
	l := s.forecast(t, "").Landings[0]
	assert.InDelta(t, 1500, grams(t, l.Spent), 1e-9)
	assert.InDelta(t, 1500+2100, grams(t, l.Expected), 1e-6)
	s.about.Now = now.Add(-4 * unit.Day) // six nights, the heavy one among them
	l = s.forecast(t, "").Landings[0]
	assert.InDelta(t, 1100, grams(t, l.Spent), 1e-9)
	assert.InDelta(t, 1100+2500, grams(t, l.Expected), 1e-6)
}

// A release is a period too: its next run must fit what is left of it.
func TestNextRunFitsRelease(t *testing.T) {
	s := tenNights(t, "450 g", "")
	s.policy = strings.Replace(s.policy, `per = "month"`, `per = "release"`, 1)
	s.marks = []*ledger.Mark{{Kind: ledger.KindRelease, Tag: "v1", Branch: "main", At: two.Add(-4 * unit.Day)}}
	f := s.forecast(t, "retrain-tide")
	if assert.NotNil(t, f.Fits, "500 of 450 g are spent") {
		assert.False(t, *f.Fits)
	}
}
