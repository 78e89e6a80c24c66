// Package report writes a statement for people and for programs: text for the
// terminal, Markdown, JSON and JUnit XML. All of them say the same thing, for
// they are made of one budget.Statement.
//
// The look is that of a page of the books: the verdict and what decided it,
// the accounts, the page of each account as it stands and as it would stand,
// why it moved, the rulings, the runs. Text that comes from records or
// policies is untrusted and is written so that it can do nothing.
package report

import (
	"fmt"
	"strings"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// Caution stands under every statement.
const Caution = "Figures are engineering estimates from measured power and declared facts, not a verified inventory. " +
	"Claims, offsets and filings follow local rules and a qualified verifier."

// cell is a text in a table. Cells with foreign text are written inert.
type cell struct {
	text    string
	foreign bool
}

func own(format string, args ...any) cell { return cell{text: fmt.Sprintf(format, args...)} }

func foreign(text string) cell { return cell{text, true} }

// table is what text and Markdown both show in their own way.
type table struct {
	title string
	head  []string
	rows  [][]cell
	fold  bool // may be folded away where the medium can
}

// value prints a quantity, and a dash for one that is not known.
func value[T fmt.Stringer](v *T) cell {
	if v == nil {
		return own("-")
	}
	return own("%s", *v)
}

// tables are the parts of a statement that are tables, in order.
func tables(s *budget.Statement) []table {
	return []table{accounts(s), changes(s), rulings(s), runs(s.Runs)}
}

func accounts(s *budget.Statement) table {
	t := table{title: "Accounts", head: []string{"account", "per", "brought forward", "this change", "carried forward", "limit", "state"}}
	for _, a := range s.Accounts {
		carried, limit := value(a.Carried), own("%s", a.Limit)
		if a.Carried != nil {
			c, l := unit.Apart(*a.Carried, a.Limit)
			carried, limit = own("%s", c), own("%s", l)
		}
		t.rows = append(t.rows, []cell{foreign(a.Name), own("%s", a.Per), value(a.Brought), value(a.Change), carried, limit, own("%s", a.State)})
	}
	return t
}

func changes(s *budget.Statement) table {
	t := table{title: "From base to head", head: []string{"job", "runs", "mean of base", "mean of head", "change", "with the grid held"}}
	for _, c := range s.Changes {
		held := own("-")
		if c.HeldRatio != nil {
			held = own("%s to %s, %s", *c.BaseHeld, *c.HeadHeld, unit.Signed(unit.Share(*c.HeldRatio)))
		}
		change := own("-")
		if c.Change != nil {
			change = own("%s", unit.Signed(*c.Change))
		}
		t.rows = append(t.rows, []cell{foreign(jobStage(c.Job, c.Stage)), own("%d to %d", c.BaseRuns, c.HeadRuns), value(c.Base), value(c.Head), change, held})
	}
	return t
}

func rulings(s *budget.Statement) table {
	t := table{title: "Rulings", head: []string{"state", "rule", "job", "observed", "limit", "policy line", "reason"}}
	for _, r := range s.Rulings {
		line := "-"
		if r.PolicyLine > 0 {
			line = fmt.Sprint(r.PolicyLine)
		}
		t.rows = append(t.rows, []cell{own("%s", r.State), foreign(r.Name), foreign(r.Job), observed(r), foreign(dash(r.LimitText)), own("%s", line), foreign(reason(r))})
	}
	return t
}

// observed is a ruling's value with its interval. The functional unit in a
// rate comes from the policy.
func observed(r budget.Ruling) cell {
	if r.IntervalText != "" {
		return foreign(r.IntervalText)
	}
	return foreign(dash(r.ObservedText))
}

func reason(r budget.Ruling) string {
	text := r.Reason
	if r.Conformance != nil {
		if text != "" {
			text += "; "
		}
		text += fmt.Sprintf("within the limit with a probability of %.2f", *r.Conformance)
	}
	return dash(text)
}

func runs(list []*footprint.Run) table {
	t := table{title: "Runs", fold: true, head: []string{"side", "run", "job", "site", "start", "hours", "outcome", "grade", "coverage", "facility", "intensity", "operational", "embodied", "total", "rate"}}
	for _, r := range list {
		t.rows = append(t.rows, []cell{own("%s", dash(r.Side)), foreign(name(r)), foreign(jobStage(r.Job, r.Stage)), foreign(dash(r.Site)),
			own("%s", r.Start.Time().Format("2006-01-02 15:04Z")), own("%.2f h", r.End.Sub(r.Start).Seconds()/3600), own("%s", r.Outcome), own("%s", dash(string(r.Grade))),
			value(r.Coverage), value(r.Facility), value(r.Intensity), value(r.Operational), value(r.Embodied), total(r), rate(r)})
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

func total(r *footprint.Run) cell {
	if r.Total != nil && r.Expanded != nil {
		return own("%s", r.Total.PlusMinus(*r.Expanded))
	}
	return value(r.Total)
}

// rate prints emissions per functional unit; the word comes from the record.
func rate(r *footprint.Run) cell {
	if r.Rate == nil {
		return own("-")
	}
	return foreign(fmt.Sprintf("%s per %s", unit.Mass(*r.Rate), r.Work.Unit))
}

func dash(text string) string {
	if text == "" {
		return "-"
	}
	return text
}

func jobStage(job, stage string) string {
	if stage == "" {
		return job
	}
	return job + ", " + stage
}

// page is an account line by line: as it stands with -, as it would stand with
// +, and what is wrong with !.
func page(a budget.AccountLine) (lines []string) {
	width := 0
	for _, l := range a.Page {
		width = max(width, len([]rune(Inert(jobStage(l.Job, l.Stage)))))
	}
	lines = append(lines, fmt.Sprintf("  %s: %s for each %s", Inert(a.Name), a.Limit, a.Per))
	for _, l := range a.Page {
		sign := "-"
		if l.Head {
			sign = "+"
		}
		what := Inert(jobStage(l.Job, l.Stage))
		pad := strings.Repeat(" ", width-len([]rune(what)))
		lines = append(lines, fmt.Sprintf("%s %s%s  %s", sign, what, pad, each(l)))
	}
	if a.Carried != nil && a.State == budget.Over {
		lines = append(lines, fmt.Sprintf("! over the limit by %s", *a.Carried-a.Limit))
	}
	return lines
}

func each(l budget.PageLine) string {
	if l.Runs == 1 {
		return fmt.Sprintf("1 run  at %s", l.Each)
	}
	return fmt.Sprintf("%d runs at %s each, from %s to %s", l.Runs, l.Each, *l.Low, *l.High)
}
