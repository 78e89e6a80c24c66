package report

import (
	"fmt"
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/stretchr/testify/require"
	"github.com/yuin/goldmark/ast"
	extended "github.com/yuin/goldmark/extension/ast"

	"budgetcheck/budget"
)

const cutHere = "The rest is in the summary of the run."

// long is a statement's Markdown with the text in every place for it.
func long(t *testing.T, text string) string {
	t.Helper()
	var b strings.Builder
	require.NoError(t, Markdown(&b, filled(t, text)))
	return b.String()
}

func TestWhatFitsIsNotCut(t *testing.T) {
	whole := long(t, "tide")
	require.Equal(t, whole, Cut(whole, utf8.RuneCountInString(whole), utf8.RuneCountInString, cutHere))
	require.NotEqual(t, whole, Cut(whole, utf8.RuneCountInString(whole)-1, utf8.RuneCountInString, cutHere))
}

// Whatever the length, and whatever foreign text says, a cut statement is a
// whole document: nothing open, nothing let loose, and the first lines are the
// whole statement's.
func TestEveryCutIsAWholeDocument(t *testing.T) {
	for n, text := range append(hostile(), "tide") {
		if testing.Short() && n%6 != 0 {
			continue
		}
		whole := long(t, text)
		size := utf8.RuneCountInString(whole)
		t.Run(fmt.Sprint(n), func(t *testing.T) {
			for room := size - 1; room > 0; room -= 1 + size/15 + n%7 { // other places in each text
				requireWhole(t, whole, Cut(whole, room, utf8.RuneCountInString, cutHere), room)
			}
		})
	}
}

func requireWhole(t *testing.T, whole, cut string, room int) {
	t.Helper()
	require.LessOrEqual(t, utf8.RuneCountInString(cut), room)
	if cut == "" {
		require.Less(t, room, 1000, "there was room for the pointer")
		return
	}
	require.Contains(t, cut, "\n"+cutHere+"\n")
	require.True(t, strings.HasSuffix(cut, Caution+"\n"), "%q", cut)
	kept, _, _ := strings.Cut(cut, "\n"+cutHere)
	rows := strings.Split(whole, "\n")
	for i, line := range strings.Split(strings.TrimRight(strings.TrimSuffix(kept, "\n</details>\n"), "\n"), "\n") {
		if kept != "" && !strings.HasPrefix(line, "```") {
			require.Equal(t, rows[i], line, "a line was cut apart")
		}
	}
	requireClosed(t, cut)
}

// requireClosed checks that the pointer stands outside of everything, and that
// each element that is opened is closed.
func requireClosed(t *testing.T, cut string) {
	t.Helper()
	open, pointers := 0, 0
	for n, in := range walk(t, cut) {
		switch n := n.(type) {
		case *ast.HTMLBlock:
			html := string(n.Lines().Value(in))
			require.Regexp(t, ownElement, html)
			open += strings.Count(html, "<details>") - strings.Count(html, "</details>")
		case *ast.RawHTML, *ast.Link, *ast.AutoLink, *ast.Image, *ast.CodeBlock, *ast.Blockquote, *extended.TaskCheckBox, *extended.Strikethrough:
			require.Failf(t, "not inert", "%s in\n%.2000s", n.Kind(), cut)
		case *ast.FencedCodeBlock:
			require.NotContains(t, string(n.Lines().Value(in)), cutHere, "in the code block")
		case *ast.Paragraph:
			if textOf(n, in) == cutHere {
				pointers++
				require.Equal(t, ast.KindDocument, n.Parent().Kind())
				require.Zero(t, open, "within something folded")
			}
		case *ast.Text:
			if outside(n) {
				requireHarmless(t, string(n.Value(in)))
			}
		}
	}
	require.Equal(t, 1, pointers)
	require.Zero(t, open)
}

const ownElement = `^(<details><summary>[^<>]*</summary>|</details>)\s*$`

func TestACutLeavesNoEmptyPart(t *testing.T) {
	whole := long(t, "tide")
	for room := 400; room < utf8.RuneCountInString(whole); room++ {
		kept, _, _ := strings.Cut(Cut(whole, room, utf8.RuneCountInString, cutHere), "\n"+cutHere)
		lines := strings.Split(strings.TrimRight(kept, "\n"), "\n")
		last := lines[len(lines)-1]
		require.NotRegexp(t, `^(#|<details>|\|[-:| ]+\|$)`, last, "room %d", room)
		require.NotRegexp(t, "```diff\n```$|---: \\|\n\n</details>$|</summary>\n+</details>$", kept, "room %d", room)
		for i, line := range lines {
			if strings.HasPrefix(line, "| ") && (i == 0 || lines[i-1] == "") {
				require.Greater(t, len(lines), i+2, "a table without a row, room %d", room)
			}
		}
	}
}

// A cut uses the room it has: only what the next row would have needed is free.
func TestACutUsesItsRoom(t *testing.T) {
	s := filled(t, "tide")
	for n := range 500 {
		r := s.Rulings[0]
		r.Name = fmt.Sprint("rule ", n)
		s.Rulings = append(s.Rulings, r)
	}
	var b strings.Builder
	require.NoError(t, Markdown(&b, s))
	row := 0
	for line := range strings.Lines(b.String()) {
		if strings.Contains(line, "`rule 499`") {
			row = utf8.RuneCountInString(line)
		}
	}
	require.NotZero(t, row)
	for room := 20_000; room < 20_200; room++ {
		require.Greater(t, utf8.RuneCountInString(Cut(b.String(), room, utf8.RuneCountInString, cutHere)), room-row-1)
	}
}

func TestCutMeasuresAsItIsTold(t *testing.T) {
	s := &budget.Statement{}
	for n := range 400 {
		s.Rulings = append(s.Rulings, budget.Ruling{Name: fmt.Sprint("潮汐 𝒯 ", n), State: budget.Within})
	}
	var b strings.Builder
	require.NoError(t, Markdown(&b, s))
	runes, bytes := Cut(b.String(), 9_000, utf8.RuneCountInString, cutHere), Cut(b.String(), 9_000, byteLen, cutHere)
	require.InDelta(t, 9_000, utf8.RuneCountInString(runes), 100)
	require.InDelta(t, 9_000, len(bytes), 100)
	require.Less(t, len(bytes), len(runes))
}

func byteLen(s string) int { return len(s) }

// Cut knows more than today's statements have in them.
func TestCutClosesWhatIsNested(t *testing.T) {
	inner := "<details><summary>a</summary>\n\n<details><summary>b</summary>\n\n~~~~\nx\n~~~\ny\n" + strings.Repeat("z\n", 100) + "~~~~\n\n</details>\n\nrow\n\n</details>\n"
	require.Equal(t, "<details><summary>a</summary>\n\n<details><summary>b</summary>\n\n~~~~\nx\n~~~\n~~~~\n\n</details>\n\n</details>\n\nmore\n",
		Cut(inner, 109, byteLen, "more"))
	require.Equal(t, inner, Cut(inner+strings.Repeat("w", 100), len(inner)+6, byteLen, "more")[:len(inner)])
}

func TestNoRoomAtAll(t *testing.T) {
	whole := long(t, "tide")
	require.Empty(t, Cut(whole, 10, byteLen, cutHere))
	last := whole[strings.LastIndex(whole, "\n\n"):]
	require.Contains(t, last, Caution)
	require.Equal(t, "\n"+cutHere+last, Cut(whole, 1+len(cutHere)+len(last), byteLen, cutHere)) // nothing but what must be there
	require.Empty(t, Cut(whole, len(cutHere)+len(last), byteLen, cutHere))
}

func FuzzCut(f *testing.F) {
	for n, text := range hostile() {
		f.Add(text, 100*n)
	}
	f.Fuzz(func(t *testing.T, text string, room int) {
		whole := long(t, text)
		if room < 1 || room >= utf8.RuneCountInString(whole) {
			return
		}
		requireWhole(t, whole, Cut(whole, room, utf8.RuneCountInString, cutHere), room)
	})
}
