package ledger

import (
	"strings"

	"github.com/jackc/pgx/v5"

	"budgetcheck/budget/unit"
)

// edging is an attempt while its parts are looked at.
type edging struct {
	begun unit.Instant
	kept  bool // the window keeps a part
}

// queueEdges asks for all parts of the attempts that were going on in the hours
// of the edges, and for the lines of those that reach into a cut.
func (a *addition) queueEdges(batch *pgx.Batch) {
	t := a.groups()
	t.add("w.hour = ANY($)", a.edges)
	reach := []string{"false"}
	for _, cut := range a.cuts {
		reach = append(reach, "e.starts < "+t.arg(int64(cut.To))+" AND e.ends >= "+t.arg(int64(cut.From)))
	}
	batch.Queue("SELECT w.line, e.attempt_id, e.starts, e.ends, l.body FROM (SELECT DISTINCT g.line, w.group_id, w.attempt_id"+
		" FROM ledger_groups g JOIN ledger_going w ON w.group_id = g.id WHERE "+t.String()+") w"+
		" JOIN ledger_entries e ON e.attempt_id = w.attempt_id AND e.group_id = w.group_id"+
		" LEFT JOIN ledger_lines l ON l.repository = e.repository AND l.n = e.n AND ("+strings.Join(reach, " OR ")+")", t.args...).
		Query(func(rows pgx.Rows) error {
			var line string
			var attempt id
			var starts, ends unit.Instant
			var body *string
			_, err := pgx.ForEachRow(rows, []any{&line, &attempt, &starts, &ends, &body}, func() error {
				s, err := a.line(line)
				if err != nil {
					return err
				}
				a.meet(s, attempt, starts, ends)
				return a.share(s, body)
			})
			return err
		})
}

// meet notes a part of an attempt.
func (a *addition) meet(s *sum, attempt id, starts, ends unit.Instant) {
	e := s.edges[attempt]
	if e == nil {
		e = &edging{begun: starts}
		s.edges[attempt] = e
	}
	e.begun = min(e.begun, starts)
	e.kept = e.kept || starts < a.To && (ends > a.From || starts >= a.From)
}

// share adds what of an entry lies in the cuts; body is nil if nothing does.
func (a *addition) share(s *sum, body *string) error {
	if body == nil {
		return nil
	}
	e, err := parsed(*body)
	if err != nil {
		return err
	}
	for _, cut := range a.cuts {
		part := e.Within(cut.From, cut.To)
		s.facility.Add(part.Facility)
		s.operational.Add(part.Operational)
		s.embodied.Add(part.Embodied)
		s.sure(part, e.doubts())
	}
	return nil
}

// runs counts the attempts that the window keeps: those that started in the
// whole hours, whose sums count them, and those that started elsewhere.
func (a *addition) runs(s *sum) int {
	n := int(s.begun)
	for _, e := range s.edges {
		if hour := e.begun.Hour(); e.kept && (hour < a.first || hour >= a.end) {
			n++
		}
	}
	return n
}
