package report

import (
	"fmt"
	"io"
	"strings"
	"unicode/utf8"

	"budgetcheck/budget"
)

// Text writes the statement for a terminal or a log.
func Text(w io.Writer, s *budget.Statement) error {
	var b strings.Builder
	fmt.Fprintf(&b, "Gate %s: %s\n", s.Gate, s.Sentence(Inert))
	fmt.Fprintf(&b, "%s\n", subject(s, Inert))
	for _, t := range tables(s) {
		textTable(&b, t)
		switch t.title {
		case titleAccounts:
			textPages(&b, s)
			textLines(&b, bridgeLine(s))
		case titleBridges:
			textLines(&b, known(s, Inert)...)
		}
	}
	textNotes(&b, allNotes(s.Notes, s.Runs))
	fmt.Fprintf(&b, "\n%s\n", foot(s))
	_, err := io.WriteString(w, b.String())
	return err
}

// textLines writes sentences, each in a line of its own below an empty one.
func textLines(b *strings.Builder, lines ...string) {
	for _, line := range lines {
		if line != "" {
			fmt.Fprintf(b, "\n%s\n", line)
		}
	}
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
	lines := [][]string{t.head}
	for _, row := range t.rows {
		line := make([]string, len(row))
		for n, c := range row {
			line[n] = Inert(c.text)
		}
		lines = append(lines, line)
	}
	fmt.Fprintf(b, "\n%s\n", t.title)
	for _, line := range aligned(lines, t.right) {
		fmt.Fprintf(b, "  %s\n", line)
	}
}

// aligned puts cells of the same column under one another.
func aligned(lines [][]string, right func(column int) bool) (out []string) {
	widths := make([]int, len(lines[0]))
	for _, line := range lines {
		for n, text := range line {
			widths[n] = max(widths[n], utf8.RuneCountInString(text))
		}
	}
	for _, line := range lines {
		cells := make([]string, len(line))
		for n, text := range line {
			cells[n] = padded(text, widths[n], right(n))
		}
		out = append(out, strings.TrimRight(strings.Join(cells, "  "), " "))
	}
	return out
}

func textNotes(b *strings.Builder, notes []string) {
	if len(notes) == 0 {
		return
	}
	b.WriteString("\nNotes\n")
	for _, n := range notes {
		fmt.Fprintf(b, "  %s\n", Inert(n))
	}
}
