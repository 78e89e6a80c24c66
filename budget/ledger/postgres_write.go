package ledger

import (
	"context"

	"github.com/jackc/pgx/v5"
)

// write enters what was decided, in one trip to the database; nothing if
// nothing is new.
func (b *booking) write(ctx context.Context, tx pgx.Tx) error {
	if len(b.lines) == 0 {
		return nil
	}
	var batch pgx.Batch
	b.writeLines(&batch)
	b.writeMarks(&batch)
	b.writeEntries(&batch)
	return tx.SendBatch(ctx, &batch).Close()
}

// writeLines also moves the heads of the repositories on, first of all: others
// that book there wait for it.
func (b *booking) writeLines(batch *pgx.Batch) {
	for _, repository := range b.repositories() {
		h := b.heads[repository]
		batch.Queue("INSERT INTO ledger_heads (repository, n, booked_at, chain) VALUES ($1, $2, $3, $4) ON CONFLICT (repository)"+
			" DO UPDATE SET n = excluded.n, booked_at = excluded.booked_at, chain = excluded.chain", repository, h.n, int64(h.bookedAt), h.chain)
	}
	var repository, body []string
	var n []int64
	var chain []id
	for _, l := range b.lines {
		repository, n, body, chain = append(repository, l.repository), append(n, l.n), append(body, l.body), append(chain, l.chain)
	}
	batch.Queue("INSERT INTO ledger_lines (repository, n, body, chain)"+
		" SELECT * FROM unnest($1::text[], $2::bigint[], $3::text[], $4::uuid[])", repository, n, body, chain)
}

func (b *booking) writeMarks(batch *pgx.Batch) {
	for _, m := range b.fresh {
		batch.Queue("INSERT INTO ledger_marks (id, repository, n, at) VALUES ($1, $2, $3, $4)", m.id(), cell(m.Repository), m.n, int64(m.At))
	}
}

// writeEntries brings what follows from the entries in force from the state
// before to the one after.
func (b *booking) writeEntries(batch *pgx.Batch) {
	was, is := outlined(b.before), outlined(b.after)
	b.writeGroups(batch)
	writeRows(batch, without(is.entries, was.entries))
	writeAttempts(batch, without(was.attempts, is.attempts), without(is.attempts, was.attempts))
	writeGoing(batch, without(was.going, is.going), without(is.going, was.going))
	b.writeHours(batch, fewer(is.begun, was.begun))
}

func (b *booking) writeGroups(batch *pgx.Batch) {
	seen := map[id]bool{}
	for k, e := range b.after {
		if g := e.groupID(); !seen[g] && b.before[k] != e {
			seen[g] = true
			batch.Queue("INSERT INTO ledger_groups (id, repository, account, line) VALUES ($1, $2, $3, $4) ON CONFLICT (id) DO NOTHING",
				g, cell(e.Repository), cell(e.Account), encode(e.group()))
		}
	}
}

// writeRows puts entries in the place of those of their key.
func writeRows(batch *pgx.Batch, rows []entryRow) {
	for _, r := range rows {
		batch.Queue("INSERT INTO ledger_entries (id, attempt_id, group_id, repository, n, starts, ends, in_doubt, run, proven_kwh, proven_g,"+
			" inputs, commit_id, digest) VALUES ($1, $2, $3, $4, $5, $6, $7, $8, $9, $10, $11, $12, $13, $14)"+
			" ON CONFLICT (id) DO UPDATE SET group_id = excluded.group_id, n = excluded.n, starts = excluded.starts, ends = excluded.ends,"+
			" in_doubt = excluded.in_doubt, proven_kwh = excluded.proven_kwh, proven_g = excluded.proven_g,"+
			" inputs = excluded.inputs, commit_id = excluded.commit_id, digest = excluded.digest", r.values()...)
	}
}

// values are the row's, in the order of the table.
func (r entryRow) values() []any {
	return []any{r.id, r.attempt, r.group, r.repository, r.n, int64(r.starts), int64(r.ends), r.inDoubt, r.run,
		float64(r.provenKWh), float64(r.provenG), r.inputs, r.commit, r.digest}
}

func writeAttempts(batch *pgx.Batch, gone, come []attemptRow) {
	columns := func(rows []attemptRow) []any {
		var group, attempt []id
		var begun, latest []int64
		for _, r := range rows {
			group, attempt = append(group, r.group), append(attempt, r.attempt)
			begun, latest = append(begun, int64(r.starts.from)), append(latest, int64(r.starts.to))
		}
		return []any{group, begun, attempt, latest}
	}
	if len(gone) > 0 {
		batch.Queue("DELETE FROM ledger_attempts WHERE (group_id, begun, attempt_id) IN"+
			" (SELECT * FROM unnest($1::uuid[], $2::bigint[], $3::uuid[]))", columns(gone)[:3]...)
	}
	if len(come) > 0 {
		batch.Queue("INSERT INTO ledger_attempts (group_id, begun, attempt_id, latest)"+
			" SELECT * FROM unnest($1::uuid[], $2::bigint[], $3::uuid[], $4::bigint[])", columns(come)...)
	}
}

func writeGoing(batch *pgx.Batch, gone, come []goingRow) {
	columns := func(rows []goingRow) []any {
		var group, attempt []id
		var hour []int64
		for _, r := range rows {
			group, hour, attempt = append(group, r.group), append(hour, r.hour), append(attempt, r.attempt)
		}
		return []any{group, hour, attempt}
	}
	if len(gone) > 0 {
		batch.Queue("DELETE FROM ledger_going WHERE (group_id, hour, attempt_id) IN (SELECT * FROM unnest($1::uuid[], $2::bigint[], $3::uuid[]))", columns(gone)...)
	}
	if len(come) > 0 {
		batch.Queue("INSERT INTO ledger_going (group_id, hour, attempt_id) SELECT * FROM unnest($1::uuid[], $2::bigint[], $3::uuid[])", columns(come)...)
	}
}

// writeHours takes out of the sums what is in force no more, and puts in what
// came into force. The database adds up, in decimals.
func (b *booking) writeHours(batch *pgx.Batch, begun map[hourRow]int64) {
	var c hourColumns
	for k, e := range b.before {
		if b.after[k] != e {
			c.entry(e.Entry, -1)
		}
	}
	for k, e := range b.after {
		if b.before[k] != e {
			c.entry(e.Entry, 1)
		}
	}
	for h, n := range begun {
		c.add(h, [5]float64{}, 1, n)
	}
	c.queue(batch, "hour", c.hour)
	c.queue(batch, "day", days(c.hour))
}

// queue adds the terms to the sums by hour, or by day.
func (c *hourColumns) queue(batch *pgx.Batch, unit string, at []int64) {
	table := "ledger_" + unit + "s"
	batch.Queue("INSERT INTO "+table+" (group_id, "+unit+", facility_kwh, operational_g, embodied_g, sure_kwh, sure_g, begun)"+
		" SELECT group_id, at, sum(facility::numeric), sum(operational::numeric), sum(embodied::numeric), sum(sure_kwh::numeric), sum(sure_g::numeric),"+
		" sum(begun)::bigint FROM unnest($1::uuid[], $2::bigint[], $3::text[], $4::text[], $5::text[], $6::text[], $7::text[], $8::bigint[])"+
		" AS d (group_id, at, facility, operational, embodied, sure_kwh, sure_g, begun) GROUP BY group_id, at"+
		" ON CONFLICT (group_id, "+unit+") DO UPDATE SET facility_kwh = "+table+".facility_kwh + excluded.facility_kwh,"+
		" operational_g = "+table+".operational_g + excluded.operational_g, embodied_g = "+table+".embodied_g + excluded.embodied_g,"+
		" sure_kwh = "+table+".sure_kwh + excluded.sure_kwh, sure_g = "+table+".sure_g + excluded.sure_g,"+
		" begun = "+table+".begun + excluded.begun",
		c.group, at, c.figures[0], c.figures[1], c.figures[2], c.figures[3], c.figures[4], c.begun)
}

// days are those that hold the hours.
func days(hours []int64) []int64 {
	list := make([]int64, len(hours))
	for n, h := range hours {
		list[n] = dayOf(h)
	}
	return list
}

// hourColumns are terms of the sums of hours.
type hourColumns struct {
	group       []id
	hour, begun []int64
	figures     [5][]string
}

// entry adds the entry's hours, or takes them away if sign is -1.
func (c *hourColumns) entry(e *Entry, sign float64) {
	group := e.groupID()
	for _, a := range e.amounts() {
		c.add(hourRow{group, a.hour}, a.figures(e.doubts()), sign, 0)
	}
}

func (c *hourColumns) add(at hourRow, figures [5]float64, sign float64, begun int64) {
	c.group, c.hour, c.begun = append(c.group, at.group), append(c.hour, at.hour), append(c.begun, begun)
	for n, x := range figures {
		c.figures[n] = append(c.figures[n], decimal(sign*x))
	}
}
