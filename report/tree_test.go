package report

import (
	"bytes"
	"iter"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"
	"github.com/yuin/goldmark"
	"github.com/yuin/goldmark/ast"
	"github.com/yuin/goldmark/extension"
	tables_ "github.com/yuin/goldmark/extension/ast"
	"github.com/yuin/goldmark/renderer/html"
	"github.com/yuin/goldmark/text"
)

// flavoured reads Markdown the way its hosts do, raw HTML included.
var flavoured = goldmark.New(goldmark.WithExtensions(extension.GFM), goldmark.WithRendererOptions(html.WithUnsafe()))

// walk gives every node of a document, with the source that it is cut from.
func walk(t *testing.T, source string) iter.Seq2[ast.Node, []byte] {
	t.Helper()
	in := []byte(source)
	root := flavoured.Parser().Parse(text.NewReader(in))
	return func(yield func(ast.Node, []byte) bool) {
		require.NoError(t, ast.Walk(root, func(n ast.Node, entering bool) (ast.WalkStatus, error) {
			if entering && !yield(n, in) {
				return ast.WalkStop, nil
			}
			return ast.WalkContinue, nil
		}))
	}
}

// textOf is the text of a node and all below it.
func textOf(n ast.Node, in []byte) string {
	var b strings.Builder
	for c := n.FirstChild(); c != nil; c = c.NextSibling() {
		switch c := c.(type) {
		case *ast.Text:
			b.Write(c.Value(in))
		case *ast.String:
			b.Write(c.Value)
		default:
			b.WriteString(textOf(c, in))
		}
	}
	return b.String()
}

// tableRows are the cells of all tables, row by row, heads included.
func tableRows(t *testing.T, source string) (rows [][]string) {
	t.Helper()
	for n, in := range walk(t, source) {
		switch n.Kind() {
		case tables_.KindTableRow, tables_.KindTableHeader:
			var cells []string
			for c := n.FirstChild(); c != nil; c = c.NextSibling() {
				cells = append(cells, textOf(c, in))
			}
			rows = append(rows, cells)
		}
	}
	return rows
}

// bars counts the pipes of a row that no backslash escapes. The parser drops
// cells beyond the head's and adds those that are missing, so that a row that
// broke apart still has the right number of them there.
func bars(row string) (n int) {
	for i := 0; i < len(row); i++ {
		switch row[i] {
		case '\\':
			i++
		case '|':
			n++
		}
	}
	return n
}

func rendered(t *testing.T, source string) string {
	t.Helper()
	var b bytes.Buffer
	require.NoError(t, flavoured.Convert([]byte(source), &b))
	return b.String()
}
