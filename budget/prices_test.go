package budget_test

import (
	"fmt"
	"strings"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"

	"budgetcheck/budget"
	"budgetcheck/budget/unit"
)

// row is a row of a series of the north, in minutes after two o'clock.
func row(from, to int, g string) string {
	at := func(minutes int) unit.Instant { return two.Add(unit.Duration(minutes) * unit.Minute) }
	return fmt.Sprintf("NORTH,%s,%s,%s,average\n", at(from), at(to), g)
}

const header = "zone,from,to,g_per_kwh,factor\n"

func priced(rows string, pairs ...string) *scene {
	s := sceneOf(night())
	s.series = header + rows
	for n := 0; n < len(pairs); n += 2 {
		s.policy = strings.Replace(s.policy, pairs[n], pairs[n+1], 1)
	}
	return s
}

// annual gives the site a mean of the year.
var annual = []string{`zone = "NORTH"`, "zone = \"NORTH\"\nannual = \"400 g/kWh\""}

func TestHoleInSeries(t *testing.T) {
	small := row(-60, 10, "100") + row(13, 90, "100")
	st := checkFine(t, priced(small, annual...), "a hole of 5 %, by the year's mean")
	assert.InDelta(t, 0.95*100+0.05*400, float64(*st.Runs[0].Total), 1e-9)
	assert.Contains(t, strings.Join(st.Runs[0].Notes, "\n"), "5.00 % of the energy is priced with the site's annual mean")
	checkDoubt(t, priced(small), "no intensity: 5.00 % of the energy falls into holes of the series for zone NORTH")

	large := row(-60, 10, "100") + row(14, 90, "100")
	checkDoubt(t, priced(large, annual...), "no intensity: 6.67 % of the energy falls into holes")
	blank := row(-60, 10, "100") + row(10, 20, "") + row(20, 90, "100")
	checkDoubt(t, priced(blank, annual...), "no intensity: 16.7 % of the energy falls into holes")
}

func TestNoSeries(t *testing.T) {
	other := strings.ReplaceAll(row(-60, 90, "100"), "NORTH", "EAST")
	st := checkDoubt(t, priced(other), "no intensity: there is no average series for zone NORTH")
	assert.Nil(t, st.Runs[0].Total)
	checkFine(t, priced(other, append(annual, `"150 g"`, `"500 g"`)...), "the year's mean, for want of a series")
}

// Average and marginal factors never meet in one sum.
func TestMarginal(t *testing.T) {
	marginal := []string{"[account]\n", "[account]\nfactor = \"marginal\"\n"}
	checkDoubt(t, priced(row(-60, 90, "100"), append(marginal, annual...)...), "no intensity: there is no marginal series for zone NORTH")
	checkFine(t, priced(strings.ReplaceAll(row(-60, 90, "100"), "average", "marginal"), marginal...), "a marginal series")
}

func TestBrokenSeries(t *testing.T) {
	rows := row(-60, 90, "100") + "NORTH,2031-03-09T00:00:00Z,2031-03-09T01:00:00Z,lots,average\n"
	checkDoubt(t, priced(rows), "the series for zone NORTH has rows that cannot be read, first grid.csv:3: ")
	checkFine(t, priced(strings.Replace(rows, "NORTH,2031-03-09", "SOUTH,2031-03-09", 1)), "another zone's row")
}

// After the end of a series the expected intensity stands in, if there is one.
func TestAfterTheSeries(t *testing.T) {
	days := func(n int) (rows string) {
		for day := n; day > 0; day-- {
			rows += row(-day*24*60, (1-day)*24*60, "100")
		}
		return rows + row(0, 30, "100")
	}
	st := checkFine(t, priced(days(7)), "a week is enough to expect from")
	assert.InDelta(t, 0.5, float64(st.Runs[0].Priced.Expected), 1e-9)
	assert.Contains(t, strings.Join(st.Runs[0].Notes, "\n"), "provisional: 50.0 % of the energy lies after the series' end")
	checkDoubt(t, priced(days(6)), "no intensity: 50.0 % of the energy falls into holes")
}

// The hour in which a run takes place decides, not the day's mean.
func TestHourByHour(t *testing.T) {
	st := checkFine(t, priced(row(-60, 15, "40")+row(15, 90, "120")), "two prices")
	assert.InDelta(t, 0.25*40+0.75*120, *ruling(t, st, "one training").Observed, 1e-9)
	assert.Equal(t, time.Date(2031, 3, 10, 2, 0, 0, 0, time.UTC), st.Runs[0].Start.Time())
	assert.Equal(t, budget.Open, st.Gate)
}
