package report

import (
	"fmt"
	"io"
	"strings"

	"budgetcheck/budget"
)

// Markdown writes the statement as GitHub Flavored Markdown.
func Markdown(w io.Writer, s *budget.Statement) error {
	var b strings.Builder
	fmt.Fprintf(&b, "**Gate %s:** %s\n\n", s.Gate, s.Sentence(code))
	fmt.Fprintf(&b, "%s\n", code(subject(s)))
	for _, t := range tables(s) {
		markdownTable(&b, t)
		if t.title == "Accounts" {
			markdownPages(&b, s)
		}
	}
	markdownNotes(&b, allNotes(s.Notes, s.Runs))
	fmt.Fprintf(&b, "\n%s\n", Caution)
	_, err := io.WriteString(w, b.String())
	return err
}

// markdownPages shows the accounts line by line. In a fenced block nothing is
// a link or a mention; its fence is longer than any in it.
func markdownPages(b *strings.Builder, s *budget.Statement) {
	var lines []string
	for n, a := range s.Accounts {
		if n > 0 {
			lines = append(lines, "")
		}
		lines = append(lines, page(a)...)
	}
	if len(lines) == 0 {
		return
	}
	text := strings.Join(lines, "\n")
	fence := strings.Repeat("`", max(3, longestRun(text, '`')+1))
	fmt.Fprintf(b, "\n%sdiff\n%s\n%s\n", fence, text, fence)
}

func markdownTable(b *strings.Builder, t table) {
	if len(t.rows) == 0 {
		return
	}
	if t.fold {
		fmt.Fprintf(b, "\n<details><summary>%s (%d)</summary>\n", t.title, len(t.rows))
		defer b.WriteString("\n</details>\n")
	} else {
		fmt.Fprintf(b, "\n#### %s\n", t.title)
	}
	fmt.Fprintf(b, "\n| %s |\n|%s\n", strings.Join(t.head, " | "), strings.Repeat(" --- |", len(t.head)))
	for _, row := range t.rows {
		b.WriteString("|")
		for _, c := range row {
			fmt.Fprintf(b, " %s |", c.markdown())
		}
		b.WriteString("\n")
	}
}

// markdown writes a cell of a table. A pipe would end the cell even in a code
// span and is escaped.
func (c cell) markdown() string {
	if c.foreign && c.text != "-" {
		return strings.ReplaceAll(code(c.text), "|", `\|`)
	}
	return c.text
}

func markdownNotes(b *strings.Builder, notes []string) {
	if len(notes) == 0 {
		return
	}
	b.WriteString("\n<details><summary>Notes</summary>\n\n")
	for _, n := range notes {
		fmt.Fprintf(b, "- %s\n", code(n))
	}
	b.WriteString("\n</details>\n")
}
