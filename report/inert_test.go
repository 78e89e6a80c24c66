package report

import (
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/stretchr/testify/require"
	"github.com/yuin/goldmark/ast"
)

func TestInert(t *testing.T) {
	for name, c := range map[string]struct{ text, want string }{
		"plain":                      {"retrain-tide, run 7", "retrain-tide, run 7"},
		"letters of any script":      {"Gezeiten – ç é 潮 مد", "Gezeiten – ç é 潮 مد"},
		"newline and tab":            {"a\r\n\tb", `a\u000d\u000a\u0009b`},
		"terminal escape":            {"\x1b[2Ja", `\u001b[2Ja`},
		"delete and C1":              {"\u007f\u009b", `\u007f\u009b`},
		"zero width":                 {"a\u200b\u200d\ufeffb", `a\u200b\u200d\ufeffb`},
		"bidirectional":              {"a\u202eb\u2066c", `a\u202eb\u2066c`},
		"tags beyond the first page": {"a\U000e0041b", `a\U000e0041b`},
		"spaces of other widths":     {"a\u00a0b\u3000", `a\u00a0b\u3000`},
		"fillers":                    {"\u115f\u3164\u2800", `\u115f\u3164\u2800`},
		"stacked marks":              {"a\u0300\u0489", `a\u0300\u0489`},
		"line separators":            {"a\u2028b\u2029", `a\u2028b\u2029`},
		"bytes that are no text":     {"a\xff\xc0b", `a\ufffd\ufffdb`},
		"not a character":            {"\uffff", `\uffff`},
		"a command":                  {"::set-output name=gate::open", `\u003a:set-output name=gate::open`},
		"a command after spaces":     {"  ::stop-commands::x", `  \u003a:stop-commands::x`},
		"two colons within":          {"tide::gauge", "tide::gauge"},
		"a command of the old kind":  {"a ##[set-output name=gate]open", `a #\u0023[set-output name=gate]open`},
		"hashes in a row":            {"#####", `#\u0023#\u0023#`},
		"one hash":                   {"#123", "#123"},
		"twenty backticks":           {strings.Repeat("`", 20), strings.Repeat("`", 20)},
		"and more":                   {strings.Repeat("`", 42), strings.Repeat("`", 20) + `\u0060` + strings.Repeat("`", 20) + `\u0060`},
		"empty":                      {"", ""},
	} {
		t.Run(name, func(t *testing.T) {
			require.Equal(t, c.want, Inert(c.text))
			if c.text != "" {
				requireOneSpan(t, c.text)
			}
		})
	}
}

func TestInertCutsAndSaysSo(t *testing.T) {
	exactly := strings.Repeat("潮", longest)
	require.Equal(t, exactly, Inert(exactly))
	require.Equal(t, exactly+"...", Inert(exactly+"潮"))
}

func TestCodeKeepsEveryCharacter(t *testing.T) {
	for _, text := range []string{"a", " a", "a ", " a ", "  a  ", "   ", "`", "``", "a`b``c", "`a", "a`", "` a `", "@everyone", `\`, `a\`, "a|b",
		"<b>", "&lt;", "[x](y)", "![x](y)", "```", "~~~", "https://x.example"} {
		require.Equal(t, text, requireOneSpan(t, text), "%q", text)
	}
}

// In a table, all but the pipe after a backslash comes out as it went in.
func TestCellCode(t *testing.T) {
	for text, want := range map[string]string{
		"a|b": "a|b", "|": "|", "||": "||", "|a|": "|a|", "a`|`b": "a`|`b", `a\`: `a\`, `a\\`: `a\\`,
		`\|`: `\\u007c`, `a\|b`: `a\\u007cb`, `\\|`: `\\\u007c`, `\||`: `\\u007c|`,
	} {
		require.Equal(t, want, requireOneCell(t, text), "%q", text)
	}
}

// requireOneSpan renders code in a line of Markdown, where it must be one code
// span with the text, and gives the span's text.
func requireOneSpan(t *testing.T, text string) string {
	t.Helper()
	source := "Gate: " + code(text) + " and more\n"
	spans := []string{}
	for node, in := range walk(t, source) {
		switch node := node.(type) {
		case *ast.CodeSpan:
			spans = append(spans, textOf(node, in))
		case *ast.Document, *ast.Paragraph, *ast.Text:
		default:
			require.Failf(t, "not inert", "%s in %q", node.Kind(), source)
		}
	}
	require.Len(t, spans, 1, "%q", source)
	require.Equal(t, Inert(text), spans[0])
	return spans[0]
}

// requireOneCell does the same in a table's cell between two others.
func requireOneCell(t *testing.T, text string) string {
	t.Helper()
	source := "| a | b | c |\n| --- | --- | --- |\n| 1 | " + cellCode(text) + " | 3 |\n"
	rows := tableRows(t, source)
	require.Len(t, rows, 2, "%q", source)
	require.Equal(t, []string{"a", "b", "c"}, rows[0])
	require.Len(t, rows[1], 3, "%q", source)
	if text != "" {
		require.Equal(t, strings.ReplaceAll(Inert(text), `\|`, `\\u007c`), rows[1][1])
	}
	require.Equal(t, "1", rows[1][0], "%q", source)
	require.Equal(t, "3", rows[1][2], "%q", source)
	require.Equal(t, 4, bars(strings.Split(source, "\n")[2]), "%q", source)
	return rows[1][1]
}

func FuzzInert(f *testing.F) {
	for _, text := range hostile() {
		f.Add(text)
	}
	f.Fuzz(func(t *testing.T, text string) {
		out := Inert(text)
		require.True(t, utf8.ValidString(out))
		require.LessOrEqual(t, utf8.RuneCountInString(out), 10*longest+3)
		require.NotContains(t, out, "##")
		require.LessOrEqual(t, longestRun(out, '`'), longestFence)
		require.False(t, strings.HasPrefix(strings.TrimSpace(out), "::"), "%q", out)
		for _, r := range out {
			require.True(t, plain(r), "%q in %q", r, out)
		}
		if text == "" {
			return
		}
		requireOneSpan(t, text)
		requireOneCell(t, text)
	})
}
