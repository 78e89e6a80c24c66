//go:build unix

package ledger

import (
	"cmp"
	"fmt"
	"maps"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgtype"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/unit"
)

// loader fills the tables with many closed runs of one part by copying rows,
// which is a hundred times as fast as booking them.
type loader struct {
	tables map[string][][]any
	hours  map[hourRow]*figures
	begun  map[hourRow]int64
	groups map[id]bool
	n      int64
	booked unit.Instant
	chain  id
}

// columns of the tables, in the order in which the loader gives them.
var columns = map[string][]string{
	"ledger_lines":  {"repository", "n", "body", "chain"},
	"ledger_groups": {"id", "repository", "account", "line"},
	"ledger_entries": {"id", "attempt_id", "group_id", "repository", "n", "starts", "ends", "in_doubt", "run", "proven_kwh", "proven_g",
		"inputs", "commit_id", "digest"},
	"ledger_attempts": {"group_id", "attempt_id", "begun", "latest"},
	"ledger_going":    {"group_id", "hour", "attempt_id"},
	"ledger_hours":    {"group_id", "hour", "facility_kwh", "operational_g", "embodied_g", "sure_kwh", "sure_g", "begun"},
	"ledger_days":     {"group_id", "day", "facility_kwh", "operational_g", "embodied_g", "sure_kwh", "sure_g", "begun"},
	"ledger_heads":    {"repository", "n", "booked_at", "chain"},
}

// load fills an empty ledger with entries of one repository.
func load(t testing.TB, s *postgres, n int, make func(int) *Entry) {
	l := &loader{tables: map[string][][]any{}, hours: map[hourRow]*figures{}, begun: map[hourRow]int64{}, groups: map[id]bool{}}
	repository := ""
	for i := range n {
		e := make(i)
		repository = e.Repository
		l.add(e)
		if i%20_000 == 0 {
			l.flush(t, s)
		}
	}
	inOrder := slices.SortedFunc(maps.Keys(l.hours), func(a, b hourRow) int { return cmp.Compare(a.hour, b.hour) })
	for _, at := range inOrder { // as bookings come
		row := []any{at.group, at.hour}
		for k := range l.hours[at] {
			row = append(row, numeric(t, l.hours[at][k].Value()))
		}
		l.row("ledger_hours", append(row, l.begun[at])...)
	}
	l.row("ledger_heads", repository, l.n, int64(l.booked), l.chain)
	l.flush(t, s)
	_, err := s.pool.Exec(ctx, "INSERT INTO ledger_days SELECT group_id, floor(hour / 24.0)::bigint, sum(facility_kwh), sum(operational_g),"+
		" sum(embodied_g), sum(sure_kwh), sum(sure_g), sum(begun) FROM ledger_hours GROUP BY 1, 2")
	require.NoError(t, err)
	_, err = s.pool.Exec(ctx, "ANALYZE")
	require.NoError(t, err)
}

func numeric(t testing.TB, x float64) (d pgtype.Numeric) {
	require.NoError(t, d.Scan(fmt.Sprintf("%.17g", x)))
	return d
}

func (l *loader) row(table string, values ...any) { l.tables[table] = append(l.tables[table], values) }

func (l *loader) add(e *Entry) {
	l.n++
	l.booked = max(l.booked, e.BookedAt, e.End)
	e.BookedAt = l.booked
	body := strings.TrimSpace(string(line{entry: e, booked: e.BookedAt}.append(nil)))
	l.chain = chained(l.chain, body)
	l.row("ledger_lines", e.Repository, l.n, body, l.chain)
	if g := e.groupID(); !l.groups[g] {
		l.groups[g] = true
		l.row("ledger_groups", g, e.Repository, e.Account, encode(e.group()))
	}
	o := outlined(map[Key]kept{e.Key(): {e, l.n}})
	for r := range o.entries {
		l.row("ledger_entries", r.values()...)
	}
	for r := range o.attempts {
		l.row("ledger_attempts", r.group, r.attempt, int64(r.starts.from), int64(r.starts.to))
	}
	for r := range o.going {
		l.row("ledger_going", r.group, r.hour, r.attempt)
	}
	for at, n := range o.begun {
		l.begun[at] += n
	}
	for _, a := range e.amounts() {
		at := hourRow{e.groupID(), a.hour}
		if l.hours[at] == nil {
			l.hours[at] = &figures{}
		}
		l.hours[at].add(a.figures(e.doubts()))
	}
}

// flush copies what was gathered.
func (l *loader) flush(t testing.TB, s *postgres) {
	for table, rows := range l.tables {
		_, err := s.pool.CopyFrom(ctx, pgx.Identifier{table}, columns[table], pgx.CopyFromRows(rows))
		require.NoError(t, err, table)
	}
	clear(l.tables)
}

// spread makes the i-th of n runs of an account over three years, of five jobs
// that take 3.5 h; one in a thousand is in doubt.
func spread(n int) func(int) *Entry {
	const years = 3 * 365 * 24
	return func(i int) *Entry {
		e := entry(fmt.Sprint("run-", i), lasting(float64(i)*years/float64(n), 3.5), job(fmt.Sprint("job-", i%5), "training"))
		e.Commit, e.Inputs = fmt.Sprint("c", i/3), fmt.Sprint("i", i/10)
		if i%1000 == 0 {
			unpriced(e)
		}
		return e
	}
}

// TestPostgresLoad: the loader of the benchmark fills the tables as booking
// does.
func TestPostgresLoad(t *testing.T) {
	if testing.Short() {
		t.Skip("only the benchmark rests on it")
	}
	loaded, booked := opened(t, freshDatabase(t)), opened(t, freshDatabase(t))
	load(t, loaded, 300, spread(300))
	for i := range 300 {
		if i%50 == 0 {
			var some []*Entry
			for k := i; k < i+50; k++ {
				some = append(some, spread(300)(k))
			}
			book(t, booked, some...)
		}
	}
	sound(t, loaded)
	require.Equal(t, read(t, booked, Query{}), read(t, loaded, Query{}))
	for table := range maps.Keys(columns) {
		var a, b int
		require.NoError(t, loaded.pool.QueryRow(ctx, "SELECT count(*) FROM "+table).Scan(&a))
		require.NoError(t, booked.pool.QueryRow(ctx, "SELECT count(*) FROM "+table).Scan(&b))
		require.Equal(t, b, a, table)
	}
	w := Window{Account: "main", From: hours(100), To: hours(700.5)}
	want, got := read(t, booked, Query{}).Spent(w), spentBy(t, loaded, w)
	require.Len(t, got.Lines, len(want.Lines))
	for n := range want.Lines {
		equalSpent(t, want.Lines[n], got.Lines[n])
	}
}

// BenchmarkPostgres: what a gate asks of books of three years, all of one
// account: it must not grow with the books.
func BenchmarkPostgres(b *testing.B) {
	sizes := []int{10_000, 100_000, 1_000_000}
	if testing.Short() {
		sizes = []int{1_000, 10_000}
	}
	for _, n := range sizes {
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			s := opened(b, freshDatabase(b))
			load(b, s, n, spread(n))
			questions(b, s)
		})
	}
}

func questions(b *testing.B, s *postgres) {
	const end = 3 * 365 * 24
	now := hours(end - 100.25) // within an hour, as a clock is
	month := Window{Repository: "harbour/tide", Account: "main", From: hours(end - 101 - 30*24), To: now}
	asked(b, "month-to-date", func() int { return len(spentBy(b, s, month).Lines) })
	asked(b, "last-30", func() int { return len(read(b, s, Query{Accounts: []string{"main"}, Last: 30}).Entries) })
	asked(b, "by-inputs", func() int { return len(read(b, s, Query{Inputs: []string{"i7"}}).Entries) })
	asked(b, "booking", func() int { return len(book(b, s, entry(fmt.Sprint(time.Now().UnixNano()), lasting(end, 3.5)))) })
}

// asked measures a question: on the mean, and at its best, which others on the
// machine disturb less.
func asked(b *testing.B, name string, ask func() int) {
	b.Run(name, func(b *testing.B) {
		least := time.Hour
		for b.Loop() {
			start := time.Now()
			require.Positive(b, ask())
			least = min(least, time.Since(start))
		}
		b.ReportMetric(float64(b.Elapsed().Microseconds())/1000/float64(b.N), "ms")
		b.ReportMetric(float64(least.Microseconds())/1000, "least-ms")
		b.ReportMetric(0, "ns/op")
	})
}
