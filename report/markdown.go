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
	fmt.Fprintf(&b, "%s\n", subject(s, code))
	for _, t := range tables(s) {
		markdownTable(&b, t)
		switch t.title {
		case titleAccounts:
			markdownPages(&b, s)
			markdownLines(&b, bridgeLine(s))
		case titleBridges:
			markdownLines(&b, known(s, code)...)
		}
	}
	markdownNotes(&b, allNotes(s.Notes, s.Runs))
	fmt.Fprintf(&b, "\n%s\n", foot(s))
	_, err := io.WriteString(w, b.String())
	return err
}

// markdownLines writes sentences as paragraphs; names in them are inert.
func markdownLines(b *strings.Builder, lines ...string) {
	for _, line := range lines {
		if line != "" {
			fmt.Fprintf(b, "\n%s\n", line)
		}
	}
}

// markdownPages shows the accounts line by line. In a fenced block nothing is
// a link or a mention; its fence is longer than any in it.
func markdownPages(b *strings.Builder, s *budget.Statement) {
	var pages []string
	for _, a := range s.Accounts {
		pages = append(pages, strings.Join(page(a), "\n"))
	}
	if len(pages) == 0 {
		return
	}
	text := strings.Join(pages, "\n\n")
	fence := strings.Repeat("`", max(3, longestRun(text, '`')+1))
	fmt.Fprintf(b, "\n%sdiff\n%s\n%s\n", fence, text, fence)
}

func markdownTable(b *strings.Builder, t table) {
	if len(t.rows) == 0 {
		return
	}
	if t.fold {
		fmt.Fprintf(b, "\n<details><summary>%s (%d)</summary>\n\n", t.title, len(t.rows))
		defer b.WriteString("\n</details>\n")
	} else {
		fmt.Fprintf(b, "\n#### %s\n\n", t.title)
	}
	rules := make([]string, len(t.head))
	for n := range rules {
		rules[n] = "---"
		if t.right(n) {
			rules[n] = "---:"
		}
	}
	markdownRow(b, t.head)
	markdownRow(b, rules)
	for _, row := range t.rows {
		cells := make([]string, len(row))
		for n, c := range row {
			cells[n] = c.markdown()
		}
		markdownRow(b, cells)
	}
}

func markdownRow(b *strings.Builder, cells []string) {
	fmt.Fprintf(b, "| %s |\n", strings.Join(cells, " | "))
}

func (c cell) markdown() string {
	if c.foreign {
		return cellCode(c.text)
	}
	return c.text
}

func markdownNotes(b *strings.Builder, notes []string) {
	if len(notes) == 0 {
		return
	}
	fmt.Fprintf(b, "\n<details><summary>Notes (%d)</summary>\n\n", len(notes))
	for _, n := range notes {
		fmt.Fprintf(b, "- %s\n", code(n))
	}
	b.WriteString("\n</details>\n")
}
