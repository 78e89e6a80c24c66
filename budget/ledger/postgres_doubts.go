package ledger

import (
	"encoding/json"

	"github.com/jackc/pgx/v5"

	"budgetcheck/budget/unit"
)

// queueDoubts asks for the entries in doubt.
func (a *addition) queueDoubts(batch *pgx.Batch) {
	t := a.within()
	batch.Queue("SELECT g.line, e.run, e.starts >= "+t.arg(int64(a.From))+" AND e.ends <= "+t.arg(int64(a.To))+", e.in_doubt, e.proven_kwh, e.proven_g"+
		" FROM ledger_groups g JOIN ledger_entries e ON e.group_id = g.id WHERE e.in_doubt > 0 AND "+t.String(), t.args...).
		Query(func(rows pgx.Rows) error {
			var line, run string
			var inside bool
			var bits int64
			var kwh, g float64
			_, err := pgx.ForEachRow(rows, []any{&line, &run, &inside, &bits, &kwh, &g}, func() error {
				return a.doubt(line, run, doubtsOf(bits), inside, unit.Energy(kwh), unit.Mass(g))
			})
			return err
		})
}

// within are the conditions on an entry e that the window keeps.
func (a *addition) within() *terms {
	t := a.groups()
	t.add("e.starts < $", int64(a.To))
	t.add("e.ends >= $ AND (e.ends > $ OR e.starts >= $)", int64(a.From))
	return t
}

func (a *addition) doubt(line, run string, d doubts, inside bool, kwh unit.Energy, g unit.Mass) error {
	s, err := a.line(line)
	if err != nil {
		return err
	}
	var name string
	if err := json.Unmarshal([]byte(run), &name); err != nil {
		return err
	}
	k := attempt{run: name}
	s.runs[k] = s.runs[k].or(d)
	if inside {
		s.provenKWh.Add(kwh)
		s.proveG.Add(g)
	}
	return nil
}

// queueRuns counts attempts one by one, for parts of one attempt may be in two
// accounts.
func (a *addition) queueRuns(batch *pgx.Batch) {
	t := a.within()
	batch.Queue("SELECT line, count(*) FROM (SELECT DISTINCT g.line, e.attempt_id FROM ledger_groups g"+
		" JOIN ledger_entries e ON e.group_id = g.id WHERE "+t.String()+") r GROUP BY line", t.args...).
		Query(rows2(func(line string, n int64) error {
			s, err := a.line(line)
			if err == nil {
				s.Runs = int(n)
			}
			return err
		}))
}
