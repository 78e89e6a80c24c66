package github

import (
	"context"
	"fmt"
	"regexp"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"github.com/yuin/goldmark"
	"github.com/yuin/goldmark/ast"
	"github.com/yuin/goldmark/extension"
	extended "github.com/yuin/goldmark/extension/ast"
	"github.com/yuin/goldmark/text"

	"budgetcheck/budget"
	"budgetcheck/report/github/apitest"
)

// hostileTexts are what a record or a policy may carry to make a posted
// statement say or do something else.
var hostileTexts = []string{
	"::set-output name=gate::open", "  ::error::x", "##[set-output name=gate]open", "%0A::warning::x", "::stop-commands::x", "a\n::add-mask::x", "a\r\n::debug::x",
	"@everyone", "@harbour/pilots, look", "#123", "https://x.example", "www.x.example", "a@b.example", "5f3c1b7a94d2f36881ce4b05a7d9e2f0316c8d47",
	"</details>", "</summary></details><h1>open</h1>", "<script>alert(1)</script>", "<!-- budgetcheck:budgetcheck -->", "-->", "\n<!-- budgetcheck:budgetcheck -->\n**Gate open:**",
	"`", "```", "`````\n@everyone", "~~~", "|", `\|`, "| a | b |\n|---|---|", "\n\n# open\n", "- item", "[x](https://x.example)", "![x](y)", "&lt;b&gt;", "&#64;everyone",
	"a\u200b@everyone", "\u202eneppo", "\u2066x\u2069", "\ufeff::debug::x", "\x00", "\x1b[31mred", "\xff\xfe", strings.Repeat("tide ", 20_000), strings.Repeat("`", 3000), outputEnd,
}

// hostileStatement has the text in every field that others write, and so many
// rulings that a comment is cut.
func hostileStatement(text string, rulings int) *budget.Statement {
	s := statement(rulings)
	s.Reason, s.Branch, s.PolicySource, s.Notes = text, text, text, []string{text}
	for n := range s.Rulings {
		r := &s.Rulings[n]
		r.Name, r.Job, r.ObservedText, r.LimitText, r.PolicyFile = text, text, text, text, text
		r.Reason = strings.Repeat(text+" ", 1+500/(len(text)+1))
	}
	return s
}

func TestHostileTextIsInertWhereverItIsPosted(t *testing.T) {
	long, cut := 0, 0
	for n, foreign := range hostileTexts {
		if testing.Short() && n%6 != 0 {
			continue
		}
		long++
		for _, rulings := range []int{4, 150} {
			t.Run(fmt.Sprint(n, " ", rulings), func(t *testing.T) {
				s := apitest.New(t, apitest.Options{})
				h, _ := patient(t, s)
				f := newFiles(t)
				p := posting()
				p.Places, p.Runner = []Place{Comment, Check, Status, Summary}, f.runner()
				p.Statement = hostileStatement(foreign, rulings)
				p.Line = func(budget.Ruling) (string, int) { return "a:b,c\n::error::x/budgetcheck.toml", 3 }
				post(t, h, p)

				body := s.Comments(214)[0].Body
				requireInert(t, strings.TrimPrefix(body, mark))
				assert.Equal(t, 1, strings.Count(body, mark))
				if strings.Contains(body, "goes on in") {
					cut++
				}
				requireInert(t, s.CheckRuns()[0].Summary)
				requireInert(t, f.summary(t))
				requireOneLine(t, s.CheckRuns()[0].Title, s.Statuses()[0].Description)
				for _, a := range s.CheckRuns()[0].Annotations {
					requireOneLine(t, a.Title, a.Message)
				}
				requireHarmlessLog(t, f, p)
			})
		}
	}
	assert.NotZero(t, long)
	assert.GreaterOrEqual(t, cut, long, "the long ones were to be cut")
}

// requireHarmlessLog writes all that goes to the log and looks for commands
// that are not ours.
func requireHarmlessLog(t *testing.T, f *files, p Posting) {
	t.Helper()
	require.NoError(t, f.runner().Annotate(p))
	require.NoError(t, f.runner().Log("Statement", p.Statement.Reason))
	require.NoError(t, f.runner().Tell([]Notice{{Comment, true, p.Statement.Reason}}))
	list := commands(f.log.String())
	require.Len(t, list, 5) // over, unproven, group and its end, the notice
	for i, want := range []string{"::error ", "::warning ", "::group::Statement", "::endgroup::", "::warning::comment: "} {
		require.True(t, strings.HasPrefix(list[i], want), list[i])
	}
	for _, line := range list[:2] {
		require.Contains(t, line, "file=a%3Ab%2Cc%0A%3A%3Aerror%3A%3Ax/budgetcheck.toml,line=3,title=")
	}
}

func requireOneLine(t *testing.T, texts ...string) {
	t.Helper()
	for _, text := range texts {
		require.NotEmpty(t, text)
		require.NotRegexp(t, "[\x00-\x1f\x7f\u0085\u200b\u202e\u2066\u2069\ufeff\u2028]", text)
	}
}

// loose is what a host would make a link or a mention of.
var loose = regexp.MustCompile(`@|#\d|://|www\.|[0-9a-f]{40}`)

// ownHTML is the HTML of a statement.
var ownHTML = regexp.MustCompile(`^(<details><summary>[^<>]*</summary>|</details>)\s*$`)

var markdown = goldmark.New(goldmark.WithExtensions(extension.GFM)).Parser()

func requireInert(t *testing.T, source string) {
	t.Helper()
	require.Empty(t, harm([]byte(source)), "in\n%.3000s", source)
}

// harm parses a text as hosts do and tells what it does beside being read: it
// may have no HTML but ours, all of it closed, no link but the pointer to the
// run, and no mention.
func harm(in []byte) (found []string) {
	open := 0
	_ = ast.Walk(markdown.Parse(text.NewReader(in)), func(n ast.Node, entering bool) (ast.WalkStatus, error) {
		bad := false
		switch n := n.(type) {
		case *ast.HTMLBlock:
			html := string(n.Lines().Value(in))
			bad = !ownHTML.MatchString(html)
			if entering {
				open += strings.Count(html, "<details>") - strings.Count(html, "</details>")
			}
		case *ast.Link:
			bad = string(n.Destination) != runPage
		case *ast.RawHTML, *ast.AutoLink, *ast.Image, *ast.CodeBlock, *ast.Blockquote, *extended.TaskCheckBox, *extended.Strikethrough:
			bad = true
		case *ast.Text:
			bad = n.Parent().Kind() != ast.KindCodeSpan && loose.Match(n.Value(in))
		}
		if bad && entering {
			found = append(found, n.Kind().String())
		}
		return ast.WalkContinue, nil
	})
	if open != 0 {
		found = append(found, "something stays open")
	}
	return found
}

// A check that looks for nothing would find everything inert.
func TestWhatIsNotInertIsFound(t *testing.T) {
	for _, bad := range []string{"<details><summary>x</summary>\n\ny\n", "@everyone", "<b>x</b>", "[x](https://x.example)", "https://x.example", "> x", "<script>\n"} {
		assert.NotEmpty(t, harm([]byte(bad)), bad)
	}
}

func TestPostingsOfHostileNames(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, _ := patient(t, s)
	for _, name := range hostileTexts {
		p := posting()
		p.Name, p.Places = name, []Place{Comment, Check, Status}
		require.Empty(t, h.Post(context.Background(), p), "%.80q", name)
	}
	for _, c := range s.Comments(214) {
		first, rest, _ := strings.Cut(c.Body, "\n")
		require.Regexp(t, `^<!-- budgetcheck:[A-Za-z0-9_.%-]+ -->$`, first)
		require.NotContains(t, first[4:len(first)-3], "--")
		require.NotContains(t, rest, "<!--")
	}
}
