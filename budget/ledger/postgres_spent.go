package ledger

import (
	"context"
	"encoding/json"
	"slices"

	"github.com/jackc/pgx/v5"

	"budgetcheck/budget/unit"
)

// Spent adds a window up in the database. Whole hours come from their sums.
// What an edge of the window cuts is shared out by the entries themselves, as
// Books does it: those of attempts that were going on in the edge's hour.
func (s *postgres) Spent(ctx context.Context, w Window) (Spending, error) {
	var a *addition
	err := s.transact(ctx, pgx.ReadOnly, func(ctx context.Context, tx pgx.Tx) error {
		a = newAddition(w)
		var batch pgx.Batch
		a.queueHours(&batch)
		a.queueEdges(&batch)
		a.queueDoubts(&batch)
		if w.Account == "" {
			a.queueRuns(&batch)
		}
		return tx.SendBatch(ctx, &batch).Close()
	})
	if err != nil {
		return Spending{}, s.failure("add up", err)
	}
	return a.spending(), nil
}

// addition is a window while it is added up.
type addition struct {
	Window
	first, end int64           // the whole hours, of which there may be none
	cuts       []Window        // what is left of the window
	edges      []int64         // the hours that the window's edges lie in
	lines      map[string]*sum // by the group, JSON
}

// sum is a line of the spending.
type sum struct {
	adding
	begun int64          // attempts that started in the whole hours
	edges map[id]*edging // attempts that were going on in the edges' hours
}

func newAddition(w Window) *addition {
	a := &addition{Window: w, first: w.From.Hour(), end: w.To.Hour(), lines: map[string]*sum{}}
	a.edges = []int64{w.From.Hour()}
	if unit.HourStart(a.first) < w.From {
		a.first++
	}
	if unit.HourStart(a.end) < w.To {
		a.edges = append(a.edges, a.end)
	}
	if a.first >= a.end {
		a.first, a.end = 0, 0
		a.cuts = []Window{w}
		return a
	}
	for _, cut := range []Window{{From: w.From, To: unit.HourStart(a.first)}, {From: unit.HourStart(a.end), To: w.To}} {
		if cut.From < cut.To {
			a.cuts = append(a.cuts, cut)
		}
	}
	return a
}

func (a *addition) line(text string) (*sum, error) {
	s := a.lines[text]
	if s == nil {
		s = &sum{adding: adding{runs: map[attempt]doubts{}}, edges: map[id]*edging{}}
		if err := json.Unmarshal([]byte(text), &s.Group); err != nil {
			return nil, err
		}
		a.lines[text] = s
	}
	return s, nil
}

// groups are the conditions on the groups that the window is of.
func (a *addition) groups() *terms {
	t := new(terms)
	t.of("g.repository", a.Repository)
	if a.Account != "" {
		t.add("g.account = $", cell(a.Account))
	}
	return t
}

// queueHours asks for the sums of whole hours: by days as far as they are whole,
// and by hours before and after these.
func (a *addition) queueHours(batch *pgx.Batch) {
	first, end := dayOf(a.first+23), dayOf(a.end)
	if first >= end {
		a.queueSums(batch, "hour", a.first, a.end)
		return
	}
	a.queueSums(batch, "hour", a.first, first*24)
	a.queueSums(batch, "day", first, end)
	a.queueSums(batch, "hour", end*24, a.end)
}

// queueSums asks for the sums of some hours or days.
func (a *addition) queueSums(batch *pgx.Batch, unit string, first, end int64) {
	if first >= end {
		return
	}
	t := a.groups()
	t.add("h."+unit+" >= $", first)
	t.add("h."+unit+" < $", end)
	batch.Queue("SELECT g.line, sum(h.facility_kwh)::float8, sum(h.operational_g)::float8, sum(h.embodied_g)::float8,"+
		" sum(h.sure_kwh)::float8, sum(h.sure_g)::float8, sum(h.begun)::bigint"+
		" FROM ledger_groups g JOIN ledger_"+unit+"s h ON h.group_id = g.id WHERE "+t.String()+" GROUP BY g.line", t.args...).
		Query(a.takeSums)
}

func (a *addition) takeSums(rows pgx.Rows) error {
	var line string
	var facility, operational, embodied, sureKWh, sureG float64
	var begun int64
	_, err := pgx.ForEachRow(rows, []any{&line, &facility, &operational, &embodied, &sureKWh, &sureG, &begun}, func() error {
		s, err := a.line(line)
		if err != nil {
			return err
		}
		s.facility.Add(unit.Energy(facility))
		s.operational.Add(unit.Mass(operational))
		s.embodied.Add(unit.Mass(embodied))
		s.sureKWh.Add(unit.Energy(sureKWh))
		s.sureG.Add(unit.Mass(sureG))
		s.begun += begun
		return nil
	})
	return err
}

// spending closes the lines.
func (a *addition) spending() (all Spending) {
	for _, s := range a.lines {
		runs := s.Runs
		if a.Account != "" {
			runs = a.runs(s)
		}
		line := s.spent()
		if line.Runs = runs; runs > 0 {
			all.Lines = append(all.Lines, line)
		}
	}
	slices.SortFunc(all.Lines, Spent.compare)
	return all
}
