package budget_test

import (
	"math"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/stat/distuv"

	"budgetcheck/budget"
	"budgetcheck/budget/ledger"
)

// K of NUMBERS 3: with the sample policy's uncertainties operational emissions
// are uncertain by 10.0995 % (k = 1), of one run and of a month alike, whether
// runs are given or booked: sqrt(0.02^2 + 0.05^2 + 0.03^2 + 0.08^2).
func TestUncertaintyOfMonth(t *testing.T) {
	for _, given := range []bool{true, false} {
		for _, nights := range []int{1, 9} {
			s := sceneOf()
			s.books = bookedNights(nights, 0)
			if given {
				s.head, s.books, s.keeps = []sketch{s.books[nights-1].sketch}, s.books[:nights-1], true
			}
			s.policy = edit(t, monthly("1.1 kg", ""), `per = "month"`, `per = "release"`, `decision = "simple"`,
				"decision = \"guarded\"\nuncertainty = { meter = \"2%\", share = \"5%\", pue = \"3%\", intensity = \"8%\" }")
			st := s.judge(t)
			r := ruling(t, st, "month")
			y := 100 * float64(nights)
			require.NotNil(t, r.Conformance)
			assert.InDelta(t, distuv.UnitNormal.CDF((1100-y)/(y*math.Sqrt(0.0102))), *r.Conformance, 1e-9, "given %v, %d nights", given, nights)
			want := budget.Within // 900 + 2 x 90.9 = 1081.8
			assert.Equal(t, want, r.State, r.Reason)
			s.policy = strings.Replace(s.policy, "1.1 kg", "1.07 kg", 1)
			if nights == 9 {
				want = budget.Near
			}
			assert.Equal(t, want, ruling(t, s.judge(t), "month").State)
		}
	}
}

// Different factors have no sum: what was priced with the marginal factor does
// not add to what the average one gave.
func TestFactorsDoNotAdd(t *testing.T) {
	s := sceneOf()
	s.books = bookedNights(3, 0)
	s.policy = monthly("1 kg", "")
	p, set := policyOf(t, s.policy), seriesOf(t, s.series)
	read := s.ledger(t, p, set)
	marginal := policyOf(t, edit(t, s.policy, "[account]\n", "[account]\nfactor = \"marginal\"\n"))
	rows := seriesOf(t, strings.ReplaceAll(s.series, "average", "marginal"))
	other := &scene{books: bookedNights(1, 5)}
	mixed := ledger.Merge(read, other.ledger(t, marginal, rows))
	c := s.about
	c.Books = p.Books(mixed, set)
	r := ruling(t, p.Judge(c), "month")
	assert.Equal(t, budget.Unproven, r.State, "observed %v", r.Observed)
	p = policyOf(t, monthly("250 g", "")) // three nights of the one factor are proven
	c.Books = p.Books(mixed, set)
	assert.Equal(t, budget.Over, ruling(t, p.Judge(c), "month").State)
}

// What a correction says stands in for what was booked first.
func TestSettledEntry(t *testing.T) {
	early := func(series string) (*scene, *ledger.Books) {
		s := sceneOf()
		s.series, s.policy = series, monthly("1 kg", "")
		s.books = bookedNights(3, 0, ranOn("b"))
		return s, s.ledger(t, policyOf(t, s.policy), seriesOf(t, s.series))
	}
	ended := header + row(-40*24*60, -60, "100") // an hour before the last night
	s, read := early(ended)
	p, set := policyOf(t, s.policy), seriesOf(t, header+row(-40*24*60, -60, "100")+row(-60, 24*60, "150"))
	corrections := p.Settle(read.Entries, set, now)
	require.Len(t, corrections, 1, "only the last night was priced with what was expected")
	assert.Equal(t, read.Entries[2].ID(), corrections[0].Corrects)
	assert.Equal(t, []string{"b0"}, []string{corrections[0].Run.Run})
	settled := ledger.Merge(&ledger.Books{Entries: corrections}, read)
	c := s.onCommit("b").about
	c.Books = p.Books(settled, set)
	assert.InDelta(t, 350, spentIn(t, p.Judge(c)), 1e-9)
	assert.Empty(t, p.Settle(settled.Entries, set, now), "settled is settled")
}
