package budget_test

import (
	"context"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/unit"
)

// adding is a store that adds up by itself.
type adding struct {
	ledger.Store
	books *ledger.Books
}

func (a adding) Spent(_ context.Context, w ledger.Window) (ledger.Spending, error) {
	return a.books.Spent(w), nil
}

// consulted judges the scene by what is read of a store that keeps its books;
// sums tells whether the store adds up.
func (s *scene) consulted(t *testing.T, sums bool) *budget.Statement {
	t.Helper()
	p, set, c := policyOf(t, s.policy), seriesOf(t, s.series), s.about
	books := s.ledger(t, p, set)
	store, err := ledger.Open(context.Background(), "file:"+filepath.Join(t.TempDir(), "books.ndjson"))
	require.NoError(t, err)
	defer func() { assert.NoError(t, store.Close()) }()
	_, err = store.Book(context.Background(), books.Entries, s.marks)
	require.NoError(t, err)
	for _, one := range s.head {
		c.Head = append(c.Head, weigh(t, p, set, one.file, one.text(t)))
	}
	if sums {
		store = adding{store, books}
	}
	c.Books, err = p.Consult(context.Background(), store, &c, set)
	require.NoError(t, err)
	return p.Judge(c)
}

// counted makes a short record of it: counters, read once an hour.
func counted(s *sketch) { s.counter, s.every = true, unit.Hour }

// Judging by what is read of a store is judging by all that it keeps, of a
// store that adds up like of one that does not.
func TestConsultTellsAll(t *testing.T) {
	rules := strings.Replace(monthly("9 kg", ""), `"150 g"`, `"1 t"`, 1)
	for _, per := range []string{"day", "week", "quarter", "year", "release", "pull"} {
		rules += "\n[[budget]]\nname = \"" + per + "\"\nlimit = \"5 kg\"\nper = \"" + per + "\"\n"
	}
	rules += "\n[[budget]]\nname = \"rate\"\nlimit = \"150 g per 1000 step\"\nper = \"year\"\n\n[[regression]]\nname = \"no creep\"\nmax_rise = \"5%\"\n"
	for pull, account := range map[int]string{0: "main", 7: "pull/7"} {
		for _, given := range []bool{true, false} {
			if testing.Short() && given == (pull > 0) {
				continue
			}
			s := sceneOf().onCommit("b")
			s.about.Pull, s.series, s.policy = pull, allYear, scheduled(t, rules)
			s.books = bookedNights(70, 1, ranOn("a"), counted)
			s.books = append(s.books, bookedAs("pull/7", night(called("x", "early"), ranOn("c"), later(-20*unit.Day), scaled(1.5))))
			s.marks = []*ledger.Mark{{Kind: ledger.KindRelease, Tag: "v1", Branch: "main", At: two.Add(-66 * unit.Day)}}
			if one := night(ranOn("b"), scaled(1.02)); given {
				s.head = []sketch{one}
			} else {
				s.books = append(s.books, bookedAs(account, one))
			}
			want := numbers(t, s.judge(t))
			assert.Equal(t, want, numbers(t, s.consulted(t, false)), "pull %d, given %v", pull, given)
			assert.Equal(t, want, numbers(t, s.consulted(t, true)), "pull %d, given %v, sums", pull, given)
		}
	}
}

// A release of long ago is looked for as far back as it lies.
func TestConsultReachesRelease(t *testing.T) {
	for _, sums := range []bool{false, true} {
		s := inPull(creeping(`against = "release"`), 100, night(scaled(1.2)))
		for n := range s.books {
			if counted(&s.books[n].sketch); n >= 5 {
				scaled(1.2)(&s.books[n].sketch)
			}
		}
		s.marks = []*ledger.Mark{{Kind: ledger.KindRelease, Tag: "v1", Branch: "main", At: two.Add(-95*unit.Day - unit.Hour)}}
		require.Equal(t, budget.Over, ruling(t, s.judge(t), "no creep").State)
		r := ruling(t, s.consulted(t, sums), "no creep")
		assert.Equal(t, budget.Over, r.State, "sums %v: %s", sums, r.Reason)
	}
}
