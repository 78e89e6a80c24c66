package ledger

import (
	"cmp"
	"context"
	"fmt"
	"maps"
	"math"
	"slices"

	"github.com/jackc/pgx/v5"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/unit"
)

// derived compares the tables that follow from the lines.
func (v *audit) derived(ctx context.Context, repository string) error {
	want := outlined(v.inForce)
	got, err := v.tables(ctx, repository)
	if err != nil {
		return err
	}
	differ(v, "entries", got.entries, want.entries)
	differ(v, "attempts", got.attempts, want.attempts)
	differ(v, "going", got.going, want.going)
	if !maps.Equal(got.begun, want.begun) {
		v.findings.Add(finding.Finding{File: v.file, What: "the numbers of runs in table ledger_hours are not those of the entries", Do: restore})
	}
	if err := v.sums(ctx, repository); err != nil {
		return err
	}
	if err := v.days(ctx, repository); err != nil {
		return err
	}
	return v.kept(ctx, repository)
}

// differ finds rows that are missing or too many.
func differ[R comparable](v *audit, table string, got, want map[R]bool) {
	if less, more := len(without(want, got)), len(without(got, want)); less+more > 0 {
		v.findings.Add(finding.Finding{File: v.file, Do: restore,
			What: fmt.Sprintf("table ledger_%s does not follow from the lines: %d rows are missing or differ, %d are too many or differ", table, less, more)})
	}
}

// tables reads them as they are.
func (v *audit) tables(ctx context.Context, repository string) (*outline, error) {
	o := outlined(nil)
	var batch pgx.Batch
	batch.Queue("SELECT id, attempt_id, group_id, repository, n, starts, ends, in_doubt, run, proven_kwh, proven_g, inputs, commit_id, digest"+
		" FROM ledger_entries WHERE repository = $1", repository).Query(func(rows pgx.Rows) error {
		var r entryRow
		_, err := pgx.ForEachRow(rows, []any{&r.id, &r.attempt, &r.group, &r.repository, &r.n, &r.starts, &r.ends, &r.inDoubt, &r.run,
			&r.provenKWh, &r.provenG, &r.inputs, &r.commit, &r.digest}, func() error { o.entries[r] = true; return nil })
		return err
	})
	const of = " JOIN ledger_groups g ON g.id = t.group_id WHERE g.repository = $1"
	batch.Queue("SELECT t.group_id, t.attempt_id, t.begun, t.latest FROM ledger_attempts t"+of, repository).Query(func(rows pgx.Rows) error {
		var r attemptRow
		_, err := pgx.ForEachRow(rows, []any{&r.group, &r.attempt, &r.starts.from, &r.starts.to}, func() error { o.attempts[r] = true; return nil })
		return err
	})
	batch.Queue("SELECT t.group_id, t.hour, t.attempt_id FROM ledger_going t"+of, repository).Query(rows3(func(group id, hour int64, attempt id) error {
		o.going[goingRow{group, hour, attempt}] = true
		return nil
	}))
	batch.Queue("SELECT t.group_id, t.hour, t.begun FROM ledger_hours t"+of, repository).Query(rows3(func(group id, hour, begun int64) error {
		if begun != 0 {
			o.begun[hourRow{group, hour}] = begun
		}
		return nil
	}))
	return o, v.tx.SendBatch(ctx, &batch).Close()
}

// sums compares the sums of hours with the entries.
func (v *audit) sums(ctx context.Context, repository string) error {
	want := map[hourRow]*figures{}
	for _, e := range v.inForce {
		for _, a := range e.amounts() {
			at := hourRow{e.groupID(), a.hour}
			if want[at] == nil {
				want[at] = &figures{}
			}
			want[at].add(a.figures(e.doubts()))
		}
	}
	rows, _ := v.tx.Query(ctx, "SELECT t.group_id, t.hour, ARRAY[t.facility_kwh::float8, t.operational_g::float8, t.embodied_g::float8,"+
		" t.sure_kwh::float8, t.sure_g::float8] FROM ledger_hours t JOIN ledger_groups g ON g.id = t.group_id WHERE g.repository = $1", repository)
	err := rows3(func(group id, hour int64, got []float64) error {
		at := hourRow{group, hour}
		v.hour(hour, want[at], got)
		delete(want, at)
		return nil
	})(rows)
	for at, f := range want {
		v.hour(at.hour, f, nil)
	}
	return err
}

// days compares the sums of days with those of hours. Decimals are exact.
func (v *audit) days(ctx context.Context, repository string) error {
	const columns = "sum(t.facility_kwh) AS a, sum(t.operational_g) AS b, sum(t.embodied_g) AS c, sum(t.sure_kwh) AS d, sum(t.sure_g) AS e, sum(t.begun) AS f"
	const of = " t JOIN ledger_groups g ON g.id = t.group_id WHERE g.repository = $1 GROUP BY 1, 2"
	var differ int
	err := v.tx.QueryRow(ctx, "SELECT count(*) FROM (SELECT t.group_id, floor(t.hour / 24.0)::bigint AS day, "+columns+" FROM ledger_hours"+of+") h"+
		" FULL JOIN (SELECT t.group_id, t.day, "+columns+" FROM ledger_days"+of+") y ON h.group_id = y.group_id AND h.day = y.day"+
		" WHERE h.a IS DISTINCT FROM y.a OR h.b IS DISTINCT FROM y.b OR h.c IS DISTINCT FROM y.c OR h.d IS DISTINCT FROM y.d"+
		" OR h.e IS DISTINCT FROM y.e OR h.f IS DISTINCT FROM y.f", repository).Scan(&differ)
	if err == nil && differ > 0 {
		v.findings.Add(finding.Finding{File: v.file, Do: restore,
			What: fmt.Sprintf("table ledger_days does not follow from the hours: %d days differ", differ)})
	}
	return err
}

// figures are the sums of an hour, in the order of the table.
type figures [5]unit.Sum[float64]

func (f *figures) add(terms [5]float64) {
	for n, x := range terms {
		f[n].Add(x)
	}
}

// hour compares one; got is nil where the table has no such row.
func (v *audit) hour(hour int64, want *figures, got []float64) {
	const rounding = 1e-9
	if want == nil {
		want = &figures{}
	}
	for n := range want {
		x, y := want[n].Value(), 0.0
		if n < len(got) {
			y = got[n]
		}
		if math.Abs(x-y) > rounding*max(math.Abs(x), math.Abs(y)) {
			v.findings.Add(finding.Finding{File: v.file, Do: restore, What: fmt.Sprintf(
				"table ledger_hours does not follow from the lines: in the hour from %s it has %v, the entries %v", unit.HourStart(hour), y, x)})
			return
		}
	}
}

// kept compares the table of marks.
func (v *audit) kept(ctx context.Context, repository string) error {
	rows, _ := v.tx.Query(ctx, "SELECT id, n FROM ledger_marks WHERE repository = $1", repository)
	err := rows2(func(m id, n int64) error {
		if v.marks[m] != n {
			v.no = int(n)
			v.add("table ledger_marks has a release that its line does not tell of", restore)
		}
		delete(v.marks, m)
		return nil
	})(rows)
	var lost []int64
	for _, n := range v.marks {
		lost = append(lost, n)
	}
	slices.SortFunc(lost, cmp.Compare[int64])
	for _, n := range lost {
		v.no = int(n)
		v.add("the release is missing from table ledger_marks", restore)
	}
	return err
}
