package report

import (
	"fmt"
	"regexp"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"
	"github.com/yuin/goldmark/ast"
	extended "github.com/yuin/goldmark/extension/ast"

	"budgetcheck/budget"
)

// shape is what a statement's Markdown is made of, foreign text left out.
type shape struct {
	kinds map[string]int // how many nodes of each kind
	rows  []int          // cells of each row
	page  int            // lines of the accounts' page
	html  []string
}

func TestHostileTextIsInertInMarkdown(t *testing.T) {
	want := shapeOf(t, filled(t, "tide"))
	require.Equal(t, 1, want.kinds["FencedCodeBlock"])
	require.Equal(t, 2, strings.Count(strings.Join(want.html, ""), "<details>"))
	for n, text := range hostile() {
		t.Run(fmt.Sprint(n), func(t *testing.T) {
			require.Equal(t, want, shapeOf(t, filled(t, text)), "%.60q", text)
		})
	}
}

var element = regexp.MustCompile(`</?[a-zA-Z!][^ >]*`)

// The page that a host shows has the same elements, whatever the names are.
func TestHostileTextIsInertInHTML(t *testing.T) {
	elements := func(text string) []string {
		var b strings.Builder
		require.NoError(t, Markdown(&b, filled(t, text)))
		return element.FindAllString(rendered(t, b.String()), -1)
	}
	want := elements("tide")
	require.Contains(t, want, "<summary")
	require.NotContains(t, want, "<a")
	for n, text := range hostile() {
		t.Run(fmt.Sprint(n), func(t *testing.T) {
			require.Equal(t, want, elements(text), "%.60q", text)
		})
	}
}

// ownHTML is all the HTML that a statement may have.
var ownHTML = regexp.MustCompile(`^(<details><summary>[A-Z][a-z]+ \(\d+\)</summary>|</details>)\s*$`)

// shapeOf parses the statement's Markdown and checks what may never be there.
func shapeOf(t *testing.T, s *budget.Statement) shape {
	t.Helper()
	var b strings.Builder
	require.NoError(t, Markdown(&b, s))
	sh := shape{kinds: map[string]int{}}
	for n, in := range walk(t, b.String()) {
		if outside(n) { // how a paragraph breaks into pieces of text does not matter
			requireHarmless(t, string(n.(*ast.Text).Value(in)))
			continue
		}
		sh.kinds[n.Kind().String()]++
		switch n := n.(type) {
		case *ast.HTMLBlock:
			html := string(n.Lines().Value(in))
			require.Regexp(t, ownHTML, html)
			sh.html = append(sh.html, html)
		case *ast.RawHTML, *ast.Link, *ast.AutoLink, *ast.Image, *extended.TaskCheckBox, *extended.Strikethrough, *ast.CodeBlock, *ast.Blockquote:
			require.Failf(t, "not inert", "%s in\n%.2000s", n.Kind(), b.String())
		case *ast.FencedCodeBlock:
			sh.page = n.Lines().Len()
			requirePage(t, string(n.Lines().Value(in)))
		case *extended.TableRow, *extended.TableHeader:
			sh.rows = append(sh.rows, n.ChildCount())
		}
	}
	delete(sh.kinds, "Text") // one inside each code span, or two
	requireBars(t, b.String())
	return sh
}

// outside tells whether the node is text that no code span holds.
func outside(n ast.Node) bool {
	return n.Kind() == ast.KindText && n.Parent().Kind() != ast.KindCodeSpan
}

// A host makes links of names, numbers and commits by itself.
var mention = regexp.MustCompile(`@|#\d|GH-\d|[0-9a-f]{40}|://|www\.|[<>\[\]]|\|`)

func requireHarmless(t *testing.T, text string) {
	t.Helper()
	require.NotRegexp(t, mention, text, "outside of code")
}

// requirePage checks that every line of the accounts' page starts as ours do.
func requirePage(t *testing.T, page string) {
	t.Helper()
	for _, line := range strings.Split(strings.TrimSuffix(page, "\n"), "\n") {
		require.Regexp(t, `^($|  .|[-+] .|! over the limit by )`, line)
	}
}

// requireBars checks that no row of a table breaks apart: all rows of one have
// as many bars as its head.
func requireBars(t *testing.T, markdown string) {
	t.Helper()
	want := 0
	for _, line := range strings.Split(markdown, "\n") {
		switch {
		case !strings.HasPrefix(line, "| "):
			want = 0
		case want == 0:
			want = bars(line)
		default:
			require.Equal(t, want, bars(line), "%.300q", line)
		}
	}
}

// A fence within the page must not be as long as the page's own.
func TestFenceIsLongerThanAnyWithin(t *testing.T) {
	for name, want := range map[string]string{"tide": "```", "``": "```", "a```b": "````", "``````": "```````"} {
		var b strings.Builder
		require.NoError(t, Markdown(&b, filled(t, name)))
		require.Contains(t, b.String(), "\n"+want+"diff\n", name)
		require.Contains(t, b.String(), "\n"+want+"\n", name)
	}
}

func TestMarkdownStaysSmallWhateverNamesAre(t *testing.T) {
	var b strings.Builder
	require.NoError(t, Markdown(&b, filled(t, strings.Repeat("tide ", 20_000))))
	require.Less(t, b.Len(), 200_000)
}
