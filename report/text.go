package report

import (
	"fmt"
	"io"
	"strings"
	"text/tabwriter"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
)

// Text writes the statement for a terminal or a log.
func Text(w io.Writer, s *budget.Statement) error {
	var b strings.Builder
	fmt.Fprintf(&b, "Gate %s: %s\n", s.Gate, Inert(s.Reason))
	fmt.Fprintf(&b, "%s\n", Inert(subject(s)))
	for _, t := range tables(s) {
		textTable(&b, t)
		if t.title == "Accounts" {
			textPages(&b, s)
		}
	}
	textNotes(&b, s.Notes, s.Runs)
	fmt.Fprintf(&b, "\n%s\n", Caution)
	_, err := io.WriteString(w, b.String())
	return err
}

// subject says what was judged, by what, when.
func subject(s *budget.Statement) string {
	text := "branch " + s.Branch
	if s.Pull > 0 {
		text += fmt.Sprintf(", pull request %d", s.Pull)
	}
	if s.HeadCommit != "" {
		text += ", commit " + s.HeadCommit
	}
	return fmt.Sprintf("%s, by the policy %s, at %s", text, s.PolicySource, s.Now)
}

func textPages(b *strings.Builder, s *budget.Statement) {
	for _, a := range s.Accounts {
		b.WriteString("\n  " + strings.Join(page(a), "\n  ") + "\n")
	}
}

func textTable(b *strings.Builder, t table) {
	if len(t.rows) == 0 {
		return
	}
	fmt.Fprintf(b, "\n%s\n", t.title)
	tw := tabwriter.NewWriter(b, 0, 0, 2, ' ', 0)
	fmt.Fprintf(tw, "  %s\n", strings.Join(t.head, "\t"))
	for _, row := range t.rows {
		cells := make([]string, len(row))
		for n, c := range row {
			cells[n] = Inert(c.text)
		}
		fmt.Fprintf(tw, "  %s\n", strings.Join(cells, "\t"))
	}
	tw.Flush()
}

func textNotes(b *strings.Builder, notes []string, runs []*footprint.Run) {
	lines := allNotes(notes, runs)
	if len(lines) == 0 {
		return
	}
	b.WriteString("\nNotes\n")
	for _, n := range lines {
		fmt.Fprintf(b, "  %s\n", Inert(n))
	}
}

// allNotes are the statement's notes and those of its runs, each once, with
// the runs that it is about.
func allNotes(notes []string, runs []*footprint.Run) []string {
	lines := append([]string(nil), notes...)
	about := map[string][]string{}
	var order []string
	for _, r := range runs {
		for _, n := range r.Notes {
			if about[n] == nil {
				order = append(order, n)
			}
			about[n] = append(about[n], name(r))
		}
	}
	for _, n := range order {
		if names := about[n]; len(names) < len(runs) || len(runs) == 1 {
			lines = append(lines, fmt.Sprintf("run %s: %s", strings.Join(names, "; "), n))
			continue
		}
		lines = append(lines, "all runs: "+n)
	}
	return lines
}

// Runs writes the footprints of runs without any ruling.
func Runs(w io.Writer, list []*footprint.Run, notes []string) error {
	var b strings.Builder
	for _, r := range list {
		b.WriteString(oneRun(r))
	}
	for _, n := range notes {
		fmt.Fprintf(&b, "%s\n", Inert(n))
	}
	fmt.Fprintf(&b, "%s\n", Caution)
	_, err := io.WriteString(w, b.String())
	return err
}

// oneRun is a run as a short list.
func oneRun(r *footprint.Run) string {
	t := runs([]*footprint.Run{r})
	var b strings.Builder
	tw := tabwriter.NewWriter(&b, 0, 0, 2, ' ', 0)
	for n, c := range t.rows[0] {
		if c.text != "-" {
			fmt.Fprintf(tw, "%s\t%s\n", t.head[n], Inert(c.text))
		}
	}
	for _, d := range r.Doubts {
		fmt.Fprintf(tw, "unproven\t%s\n", Inert(d.Reason))
	}
	for _, n := range r.Notes {
		fmt.Fprintf(tw, "note\t%s\n", Inert(n))
	}
	tw.Flush()
	return b.String() + "\n"
}
