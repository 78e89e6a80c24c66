package ledger

import (
	"context"
	"strings"

	"github.com/jackc/pgx/v5"
)

// statement is one to be run.
type statement struct {
	text string
	args []any
}

// groups are the query's conditions on a group g.
func (q *Query) groups(t *terms) {
	t.of("g.repository", q.Repository)
	if len(q.Accounts) > 0 {
		t.add("g.account = ANY($)", cells(q.Accounts))
	}
}

// span are the query's conditions on the time of an entry e.
func (q *Query) span(t *terms) {
	t.add("e.ends > $", int64(q.Since))
	if q.Until != 0 {
		t.add("e.starts < $", int64(q.Until))
	}
}

// names are the query's conditions on what an entry e stands for, of which one
// has to hold.
func (q *Query) names(t *terms) {
	var any []string
	for column, values := range map[string][]string{"e.inputs": q.Inputs, "e.commit_id": q.Commits, "e.digest": q.Digests} {
		if len(values) > 0 {
			any = append(any, column+" = ANY("+t.arg(cells(values))+")")
		}
	}
	if len(any) > 0 {
		t.conditions = append(t.conditions, "("+strings.Join(any, " OR ")+")")
	}
}

// ofLine joins an entry's line.
const ofLine = " JOIN ledger_lines l ON l.repository = e.repository AND l.n = e.n WHERE "

// newest are the statements that read entries. Of the last runs they may give
// more than are asked for.
func (q *Query) newest(ctx context.Context, tx pgx.Tx) ([]statement, error) {
	switch {
	case q.OnlyMarks:
		return nil, nil
	case q.Last == 0 || len(q.Inputs)+len(q.Commits)+len(q.Digests) > 0: // of which there are few
		t := new(terms)
		q.span(t)
		q.groups(t)
		q.names(t)
		return []statement{{"SELECT l.repository, l.n, l.body FROM ledger_groups g JOIN ledger_entries e ON e.group_id = g.id" + ofLine + t.String(), t.args}}, nil
	}
	return q.last(ctx, tx)
}

// last asks for the last runs, group by group. Attempts are walked from the
// newest on until so many are found; no run that is among the last was over
// before they had all begun.
func (q *Query) last(ctx context.Context, tx pgx.Tx) (list []statement, err error) {
	t := new(terms)
	q.span(t)
	text := "SELECT g.id, n.begun FROM ledger_groups g CROSS JOIN LATERAL (SELECT min(a.begun) AS begun FROM (SELECT a.begun FROM ledger_attempts a" +
		" WHERE a.group_id = g.id AND EXISTS (SELECT 1 FROM ledger_entries e WHERE e.attempt_id = a.attempt_id AND e.group_id = g.id AND " +
		t.String() + ") ORDER BY a.begun DESC LIMIT " + t.arg(q.Last) + ") a) n WHERE "
	t.conditions = []string{"n.begun IS NOT NULL"}
	q.groups(t)
	rows, _ := tx.Query(ctx, text+t.String(), t.args...)
	err = rows2(func(group id, begun int64) error {
		t := new(terms)
		q.span(t)
		t.add("a.group_id = $", group)
		t.add("a.latest >= $", begun)
		list = append(list, statement{"SELECT l.repository, l.n, l.body FROM ledger_attempts a" +
			" JOIN ledger_entries e ON e.attempt_id = a.attempt_id AND e.group_id = a.group_id" + ofLine + t.String(), t.args})
		return nil
	})(rows)
	return list, err
}

// marks is the statement that reads marks.
func (q *Query) marks() statement {
	t := new(terms)
	t.add("m.at >= $", int64(q.Since))
	if q.Until != 0 {
		t.add("m.at < $", int64(q.Until))
	}
	t.of("m.repository", q.Repository)
	return statement{"SELECT l.repository, l.n, l.body FROM ledger_marks m JOIN ledger_lines l ON l.repository = m.repository AND l.n = m.n WHERE " + t.String(), t.args}
}
