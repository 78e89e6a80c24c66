package report

import (
	"fmt"
	"slices"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// table is what text and Markdown both show in their own way.
type table struct {
	title string
	head  []string
	rows  [][]cell
	fold  bool // may be folded away where the medium can
}

// right tells whether a column's cells stand at its right, as numbers do.
func (t table) right(column int) bool { return slices.Contains(numbers, t.head[column]) }

var numbers = []string{"brought forward", "this change", "carried forward", "limit", "runs", "mean of base", "mean of head", "change",
	"base, grid held", "head, grid held", "change, grid held", "observed", "probability within", "policy line", "duration",
	"the code", "work", "efficiency", "energy", "not the code", "grid", "grid: zone", "grid: day", "grid: hour",
	"spent", "without the change", "expected", "runs left", "burn ratio", "open", "closed", "unproven",
	"coverage", "facility", "intensity", "operational", "embodied", "total", "rate", "market-based"}

// The tables that lines of text follow.
const (
	titleAccounts = "Accounts"
	titleBridges  = "Why it moved"
)

// cell is a text in a table. Cells with foreign text are written inert.
type cell struct {
	text    string
	foreign bool
}

// none stands where a value does not apply or is not known.
var none = cell{text: "-"}

func own(format string, args ...any) cell { return cell{text: fmt.Sprintf(format, args...)} }

func foreign(text string) cell {
	if text == "" {
		return none
	}
	return cell{text, true}
}

// value prints a quantity, if it is known.
func value[T fmt.Stringer](v *T) cell {
	if v == nil {
		return none
	}
	return own("%s", *v)
}

// slim leaves out the columns in which nothing stands.
func (t table) slim() table {
	s := table{title: t.title, fold: t.fold, rows: make([][]cell, len(t.rows))}
	for n, c := range t.head {
		empty := true
		for _, row := range t.rows {
			empty = empty && row[n] == none
		}
		if empty {
			continue
		}
		s.head = append(s.head, c)
		for i, row := range t.rows {
			s.rows[i] = append(s.rows[i], row[n])
		}
	}
	return s
}

// tables are the parts of a statement that are tables, in order.
func tables(s *budget.Statement) []table {
	return []table{accounts(s), landings(s.Landings).slim(), changes(s), bridges(s).slim(), rulings(s).slim(), edits(s), preview(s), replayed(s.Replay), runs(s.Runs).slim()}
}

func accounts(s *budget.Statement) table {
	t := table{title: titleAccounts, head: []string{"account", "per", "brought forward", "this change", "carried forward", "limit", "state"}}
	for _, a := range s.Accounts {
		carried, limit := value(a.Carried), own("%s", a.Limit)
		if a.Carried != nil {
			c, l := unit.Apart(*a.Carried, a.Limit)
			carried, limit = own("%s", c), own("%s", l)
		}
		t.rows = append(t.rows, []cell{foreign(a.Name), per(a.Per, a.Period), value(a.Brought), value(a.Change), carried, limit, own("%s", a.State)})
	}
	return t
}

func changes(s *budget.Statement) table {
	t := table{title: "From base to head", head: []string{"job", "runs", "mean of base", "mean of head", "change",
		"base, grid held", "head, grid held", "change, grid held"}}
	for _, c := range s.Changes {
		change, held := none, none
		if c.Change != nil {
			change = own("%s", unit.Signed(*c.Change))
		}
		if c.HeldRatio != nil {
			held = own("%s", unit.Signed(unit.Share(*c.HeldRatio)))
		}
		t.rows = append(t.rows, []cell{foreign(jobStage(c.Job, c.Stage)), own("%d to %d", c.BaseRuns, c.HeadRuns),
			value(c.Base), value(c.Head), change, value(c.BaseHeld), value(c.HeadHeld), held})
	}
	return t
}

func runs(list []*footprint.Run) table {
	t := table{title: "Runs", fold: true, head: []string{"side", "run", "job", "site", "start", "duration", "outcome", "grade", "coverage",
		"facility", "intensity", "operational", "embodied", "total", "rate", "market-based"}}
	for _, r := range list {
		t.rows = append(t.rows, []cell{own("%s", dash(r.Side)), foreign(name(r)), foreign(jobStage(r.Job, r.Stage)), foreign(r.Site),
			start(r), own("%s", r.End.Sub(r.Start)), own("%s", r.Outcome), own("%s", dash(string(r.Grade))),
			value(r.Coverage), value(r.Facility), value(r.Intensity), value(r.Operational), value(r.Embodied), total(r), rate(r), value(r.Market)})
	}
	return t
}

// name tells attempts apart.
func name(r *footprint.Run) string {
	if r.Attempt > 1 {
		return fmt.Sprintf("%s, attempt %d", r.Run, r.Attempt)
	}
	return r.Run
}

func start(r *footprint.Run) cell { return own("%s", r.Start.Time().Format("2006-01-02 15:04Z")) }

func total(r *footprint.Run) cell {
	if r.Total != nil && r.Expanded != nil {
		return own("%s", r.Total.PlusMinus(*r.Expanded))
	}
	return value(r.Total)
}

// rate prints emissions per functional unit; the word comes from the record.
func rate(r *footprint.Run) cell {
	if r.Rate == nil {
		return none
	}
	return foreign(fmt.Sprintf("%s per %s", unit.Mass(*r.Rate), r.Work.Unit))
}

func dash(text string) string {
	if text == "" {
		return none.text
	}
	return text
}

func jobStage(job, stage string) string {
	if stage == "" {
		return job
	}
	return job + ", " + stage
}
