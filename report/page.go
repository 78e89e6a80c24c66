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
	"math"
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
	if period := pagePeriod(a); period != "" {
		lines[0] += ", " + Inert(period)
	}
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
	return append(lines, wrong(a)...)
}

// pagePeriod is the period that the page is about: of a landing it may be the
// next one.
func pagePeriod(a budget.AccountLine) string {
	if a.Landing != nil {
		return a.Landing.Period
	}
	return a.Period
}

// wrong is what is wrong with an account, in a line.
func wrong(a budget.AccountLine) []string {
	switch {
	case a.State == budget.Unproven:
		return []string{"! unproven, see the rulings"}
	case a.State == budget.Waived:
		return []string{"! waived, see the rulings"}
	case a.State == budget.Over && a.Carried != nil:
		return []string{fmt.Sprintf("! over the limit by %s", *a.Carried-a.Limit)}
	case a.Landing != nil && a.Landing.Expected != nil && *a.Landing.Expected > a.Limit:
		return []string{fmt.Sprintf("! lands over the limit by %s", *a.Landing.Expected-a.Limit)}
	case a.Landing != nil && a.Brought != nil && *a.Brought > a.Limit:
		return []string{fmt.Sprintf("! over the limit by %s before this change", *a.Brought-a.Limit)}
	}
	return nil
}

func pageName(l budget.PageLine) string {
	if l.Lands {
		return "landing"
	}
	return Inert(jobStage(l.Job, l.Stage))
}

func each(l budget.PageLine) string {
	switch {
	case l.Lands && l.Low != nil:
		return fmt.Sprintf("%s, from %s to %s", l.Each, *l.Low, *l.High)
	case l.Lands:
		return l.Each.String()
	case l.Left == 1:
		return fmt.Sprintf("1 run left at %s", l.Each)
	case l.Left > 0:
		return fmt.Sprintf("%s runs left at %s each", amount(l.Left), l.Each)
	case l.Runs == 1:
		return fmt.Sprintf("1 run  at %s", l.Each)
	case l.Low == nil:
		return fmt.Sprintf("%d runs at %s each", l.Runs, l.Each)
	}
	return fmt.Sprintf("%d runs at %s each, from %s to %s", l.Runs, l.Each, *l.Low, *l.High)
}

// amount is a number of runs; one that is only expected need not be whole.
func amount(n float64) string {
	if n == math.Trunc(n) {
		return fmt.Sprintf("%.0f", n)
	}
	return fmt.Sprintf("about %.3g", n)
}

// padded fills text up with spaces, before it or after.
func padded(text string, width int, before bool) string {
	space := strings.Repeat(" ", max(min(width, widest)-utf8.RuneCountInString(text), 0))
	if before {
		return space + text
	}
	return text + space
}
