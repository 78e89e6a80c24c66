package github

import (
	"strings"

	"budgetcheck/budget"
	"budgetcheck/report"
)

// verdict is what a posting comes to.
type verdict string

const (
	gateOpen    verdict = "open"
	gateClosed  verdict = "closed"
	gateUnknown verdict = "unknown" // it could not be judged
	gatePending verdict = "pending" // records are still to come
)

func (p Posting) verdict() verdict {
	switch {
	case p.Statement == nil:
		return gateUnknown
	case p.Await:
		return gatePending
	case p.Statement.Gate == budget.Open:
		return gateOpen
	}
	return gateClosed
}

// line is the deciding line, in plain text.
func (p Posting) line() string {
	why := p.Trouble
	if p.Statement != nil {
		why = p.Statement.Reason
	}
	text := "Gate " + string(p.verdict()) + ": " + report.Inert(strings.ReplaceAll(why, "\n", "; "))
	if p.ReportOnly && p.verdict() == gateClosed {
		text = "Report only. " + text
	}
	return text
}

// The most that hosts take.
const (
	mostName        = 100 // of a check and a status: what a page shows of it
	mostTitle       = 255
	mostComment     = 65536
	mostCheckText   = 65535
	mostAnnotations = 50 // in one request
	mostMessage     = 64 << 10
	mostDescription = 140
	mostSummary     = 1 << 20 // bytes of a step's summary
)

// fitted is the statement cut to what a place takes, with a pointer to where
// the whole is.
func (p Posting) fitted(room int, size func(string) int, run string) string {
	return report.Cut(p.Markdown, room, size, p.pointer(run))
}

// pointer says where the whole statement is. run is the run's address.
func (p Posting) pointer(run string) string {
	where := "the statement.md of this run"
	if p.wants(Summary) && p.Runner != nil {
		where = "the summary of this run"
	}
	if run != "" {
		where = "[" + where + "](" + run + ")"
	}
	return "The statement is longer than this page takes: it ends here, and goes on in " + where + "."
}
