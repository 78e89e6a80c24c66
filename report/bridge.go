package report

import (
	"fmt"
	"strings"

	"budgetcheck/budget"
	"budgetcheck/budget/compare"
	"budgetcheck/budget/unit"
)

// bridgeLine tells in one line why the change moved, over all jobs that are on
// both sides; "" where there is nothing to tell.
func bridgeLine(s *budget.Statement) string {
	sum, base, jobs := summed(s)
	if jobs == 0 {
		return ""
	}
	change := byCode(sum) + byOther(sum)
	told := func(g unit.Mass) string { return unit.Signed(unrounded(g, base+abs(change))) }
	text := fmt.Sprintf("Moved by %s%s", told(change), ofBase(change, base))
	text += fmt.Sprintf(": the code %s", told(byCode(sum))) +
		among(told, part{"work", sum.Work}, part{"efficiency", sum.Efficiency}, part{"energy", sum.Energy}, part{"embodied", sum.Embodied})
	return text + fmt.Sprintf("; not the code %s", told(byOther(sum))) + among(told, part{"site", sum.Site}, part{"grid", sum.Grid})
}

// part is one cause and what it adds.
type part struct {
	name string
	g    *unit.Mass
}

// among lists the parts that are there, in brackets.
func among(told func(unit.Mass) string, parts ...part) string {
	var listed []string
	for _, p := range parts {
		if p.g != nil {
			listed = append(listed, fmt.Sprintf("%s %s", p.name, told(*p.g)))
		}
	}
	if len(listed) == 0 {
		return ""
	}
	return " (" + strings.Join(listed, ", ") + ")"
}

// unrounded is zero for what is only rounding beside the whole.
func unrounded(g, whole unit.Mass) unit.Mass {
	const rounding = 1e-9
	if abs(g) <= rounding*whole {
		return 0
	}
	return g
}

func abs(g unit.Mass) unit.Mass { return max(g, -g) }

// ofBase is a change as a share of the base.
func ofBase(change, base unit.Mass) string {
	if base <= 0 {
		return ""
	}
	return fmt.Sprintf(", %s", unit.Signed(unit.Share(change/base)))
}

// summed adds the bridges of all jobs.
func summed(s *budget.Statement) (sum compare.Bridge, base unit.Mass, jobs int) {
	for _, c := range s.Changes {
		b := c.Bridge
		if b == nil {
			continue
		}
		jobs++
		if c.Base != nil {
			base += *c.Base
		}
		for to, g := range map[**unit.Mass]*unit.Mass{&sum.Work: b.Work, &sum.Efficiency: b.Efficiency, &sum.Energy: b.Energy,
			&sum.Site: b.Site, &sum.Grid: b.Grid, &sum.Embodied: b.Embodied} {
			plus(to, g)
		}
	}
	return sum, base, jobs
}

func plus(to **unit.Mass, g *unit.Mass) {
	if g == nil {
		return
	}
	total := *g
	if *to != nil {
		total += **to
	}
	*to = &total
}

// byCode is what the change itself did, byOther what it cannot help.
func byCode(b compare.Bridge) unit.Mass {
	return of(b.Work) + of(b.Efficiency) + of(b.Energy) + of(b.Embodied)
}

func byOther(b compare.Bridge) unit.Mass { return of(b.Site) + of(b.Grid) }

func of(g *unit.Mass) unit.Mass {
	if g == nil {
		return 0
	}
	return *g
}

// bridges is the same by job, each cause in g and as a share of the base.
func bridges(s *budget.Statement) table {
	t := table{title: titleBridges, head: []string{"job", "change", "the code", "work", "efficiency", "energy", "embodied",
		"not the code", "site", "grid", "grid: zone", "grid: day", "grid: hour"}}
	for _, c := range s.Changes {
		b := c.Bridge
		if b == nil || c.Change == nil {
			continue
		}
		base := of(c.Base)
		g := func(m *unit.Mass) cell {
			if m == nil {
				return none
			}
			v := unrounded(*m, base+abs(*c.Change))
			return own("%s%s", unit.Signed(v), ofBase(v, base))
		}
		ours, other := byCode(*b), byOther(*b)
		row := []cell{foreign(jobStage(c.Job, c.Stage)), g(c.Change), g(&ours), g(b.Work), g(b.Efficiency), g(b.Energy), g(b.Embodied),
			g(&other), g(b.Site), g(b.Grid)}
		if p := b.Parts; p != nil {
			row = append(row, g(&p.Zone), g(&p.Day), g(&p.Hour))
		} else {
			row = append(row, none, none, none)
		}
		t.rows = append(t.rows, row)
	}
	return t
}

// known says in a sentence for each job what is known of its rise, with what
// confidence, from how many runs, and what more runs would do.
// quote makes names inert where the sentence is going to stand.
func known(s *budget.Statement, quote func(string) string) (sentences []string) {
	for _, c := range s.Changes {
		if c.HeldRatio == nil {
			continue
		}
		text := fmt.Sprintf("Job %s: %s with the grid held", quote(jobStage(c.Job, c.Stage)), unit.Signed(unit.Share(*c.HeldRatio)))
		if c.LowRatio != nil && c.HighRatio != nil && c.Confidence != nil {
			text += fmt.Sprintf(" (%s to %s, each bound at %s)", unit.Signed(unit.Share(*c.LowRatio)), unit.Signed(unit.Share(*c.HighRatio)), unit.Share(*c.Confidence))
		}
		text += fmt.Sprintf(", from %s and %s", count(c.BaseRuns, "base run"), count(c.HeadRuns, "head run"))
		if c.Detectable != nil {
			text += fmt.Sprintf("; a rise of %s would have been seen", unit.Share(*c.Detectable))
		}
		if c.RunsNeeded != nil && *c.RunsNeeded > c.HeadRuns {
			text += fmt.Sprintf("; %s more would settle it", count(*c.RunsNeeded-c.HeadRuns, "head run"))
		}
		if c.LowRatio == nil {
			text += "; what is noise cannot be told from so few"
		}
		sentences = append(sentences, text+".")
	}
	return sentences
}

func count(n int, what string) string {
	if n != 1 {
		what += "s"
	}
	return fmt.Sprintf("%d %s", n, what)
}
