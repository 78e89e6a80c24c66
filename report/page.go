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
	"slices"
	"strings"
	"unicode/utf8"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
)

// Caution stands under every statement.
const Caution = "Figures are engineering estimates from measured power and declared facts, not a verified inventory. " +
	"Claims, offsets and filings follow local rules and a qualified verifier."

// foot stands under the statement.
func foot(s *budget.Statement) string {
	if slices.ContainsFunc(s.Runs, func(r *footprint.Run) bool { return r.Expanded != nil }) {
		return "± is the expanded uncertainty, k = 2. " + Caution
	}
	return Caution
}

// subject says what was judged, by what, when. quote makes text that somebody
// else wrote inert where the line is going to stand.
func subject(s *budget.Statement, quote func(string) string) string {
	text := "Branch " + quote(s.Branch)
	if s.Pull > 0 {
		text += fmt.Sprintf(", pull request %d", s.Pull)
	}
	if s.HeadCommit != "" {
		text += ", commit " + quote(s.HeadCommit)
	}
	if s.BaseCommit != "" {
		text += ", base " + quote(s.BaseCommit)
	}
	text += fmt.Sprintf(", by the policy %s, at %s", quote(s.PolicySource), s.Now)
	if len(s.Runs) > 0 {
		text += fmt.Sprintf(", location-based with the %s factor, %s boundary", s.Runs[0].Factor, s.Runs[0].Boundary)
	}
	return text
}

// widest is how far the columns of plain text are drawn apart. Longer texts
// break their own line and no other.
const widest = 60

// page is an account line by line: as it stands with -, as it would stand with
// +, and what is wrong with !.
func page(a budget.AccountLine) []string {
	lines := []string{fmt.Sprintf("  %s: %s for each %s", Inert(a.Name), a.Limit, a.Per)}
	width := 0
	for _, l := range a.Page {
		width = max(width, utf8.RuneCountInString(pageName(l)))
	}
	for _, l := range a.Page {
		sign := "-"
		if l.Head {
			sign = "+"
		}
		lines = append(lines, fmt.Sprintf("%s %s  %s", sign, padded(pageName(l), width, false), each(l)))
	}
	switch {
	case a.State == budget.Over && a.Carried != nil:
		lines = append(lines, fmt.Sprintf("! over the limit by %s", *a.Carried-a.Limit))
	case a.State == budget.Unproven:
		lines = append(lines, "! unproven, see the rulings")
	}
	return lines
}

func pageName(l budget.PageLine) string { return Inert(jobStage(l.Job, l.Stage)) }

func each(l budget.PageLine) string {
	if l.Runs == 1 {
		return fmt.Sprintf("1 run  at %s", l.Each)
	}
	return fmt.Sprintf("%d runs at %s each, from %s to %s", l.Runs, l.Each, *l.Low, *l.High)
}

// padded fills text up with spaces, before it or after.
func padded(text string, width int, before bool) string {
	space := strings.Repeat(" ", max(min(width, widest)-utf8.RuneCountInString(text), 0))
	if before {
		return space + text
	}
	return text + space
}
