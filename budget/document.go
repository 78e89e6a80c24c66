package budget

import (
	"bytes"
	"errors"
	"fmt"
	"slices"
	"strings"

	"github.com/pelletier/go-toml/v2"
	"github.com/pelletier/go-toml/v2/unstable"

	"budgetcheck/budget/finding"
)

// node is a value of a policy file that knows where it stands. Exactly one of
// table, list and value is set.
type node struct {
	file  string
	line  int
	table map[string]*node
	list  []*node
	value any // string, int64, float64, bool or a toml date
}

// parseDocument reads TOML into nodes. The library checks the syntax and gives
// the values; its syntax tree gives the lines, which a policy's rulings carry.
func parseDocument(data []byte, file string) (*node, *finding.Finding) {
	data = bytes.TrimPrefix(data, []byte("\xef\xbb\xbf")) // a byte order mark says nothing
	var values map[string]any
	if err := toml.Unmarshal(data, &values); err != nil {
		return nil, syntaxFinding(err, file)
	}
	l := lines{at: map[string]int{}, count: map[string]int{}}
	l.parser.Reset(data)
	for l.parser.NextExpression() {
		l.expression(l.parser.Expression())
	}
	return l.node(values, "", file), nil
}

func syntaxFinding(err error, file string) *finding.Finding {
	f := &finding.Finding{File: file, What: err.Error(), Do: "mend the TOML"}
	var at *toml.DecodeError
	if errors.As(err, &at) {
		f.Line, _ = at.Position()
	}
	return f
}

// lines maps the path of each key to its line. Paths are made by keyPath and element.
type lines struct {
	parser unstable.Parser
	at     map[string]int
	count  map[string]int // tables so far in each array of tables
	prefix string         // path of the table being read
}

func keyPath(prefix, key string) string { return fmt.Sprintf("%s\x1f%s", prefix, key) }

func element(list string, n int) string { return fmt.Sprintf("%s\x1f[%d]", list, n) }

func (l *lines) expression(e *unstable.Node) {
	switch e.Kind {
	case unstable.Table:
		l.prefix = l.header(e, false)
	case unstable.ArrayTable:
		l.prefix = l.header(e, true)
	case unstable.KeyValue:
		l.pair(e, l.prefix)
	}
}

// header gives the path of a table header. A key that names an array of tables
// means the last of them, or with next a new one.
func (l *lines) header(e *unstable.Node, next bool) (p string) {
	for it := e.Key(); it.Next(); {
		p = keyPath(p, string(it.Node().Data))
		l.note(p, it.Node())
		if next && it.IsLast() {
			l.count[p]++
		}
		if n := l.count[p]; n > 0 {
			p = element(p, n-1)
			l.note(p, it.Node())
		}
	}
	return p
}

// note keeps the first line at which a path is met.
func (l *lines) note(p string, n *unstable.Node) {
	if _, known := l.at[p]; !known {
		l.at[p] = l.parser.Shape(n.Raw).Start.Line
	}
}

func (l *lines) pair(e *unstable.Node, prefix string) {
	for it := e.Key(); it.Next(); {
		prefix = keyPath(prefix, string(it.Node().Data))
		l.note(prefix, it.Node())
	}
	l.inside(e.Value(), prefix)
}

// inside notes the keys of inline tables, in arrays too.
func (l *lines) inside(v *unstable.Node, p string) {
	children := v.Children()
	for n := 0; children.Next(); n++ {
		switch v.Kind {
		case unstable.InlineTable:
			l.pair(children.Node(), p)
		case unstable.Array:
			item, at := children.Node(), element(p, n)
			l.at[at] = l.at[p] // an array in an array does not tell its own line
			if item.Raw.Length > 0 {
				l.at[at] = l.parser.Shape(item.Raw).Start.Line
			}
			l.inside(item, at)
		}
	}
}

func (l *lines) node(v any, p, file string) *node {
	n := &node{file: file, line: l.at[p]}
	switch v := v.(type) {
	case map[string]any:
		n.table = map[string]*node{}
		for key, inner := range v {
			n.table[key] = l.node(inner, keyPath(p, key), file)
		}
	case []any:
		n.list = make([]*node, len(v))
		for i, inner := range v {
			n.list[i] = l.node(inner, element(p, i), file)
		}
	default:
		n.value = v
	}
	return n
}

// shareFormat lets each of several files say the format, if they say the same.
func (n *node) shareFormat(o *node) {
	mine, theirs := n.table["format"], o.table["format"]
	if mine != nil && theirs != nil && mine.value == theirs.value {
		delete(o.table, "format")
	}
}

// merge adds another file's document: tables add up, arrays of tables are
// joined, and a key that both set is a finding.
func (n *node) merge(o *node, report func(finding.Finding)) {
	for _, key := range o.keys() {
		mine, theirs := n.table[key], o.table[key]
		switch {
		case mine == nil:
			n.table[key] = theirs
		case mine.table != nil && theirs.table != nil:
			mine.merge(theirs, report)
		case mine.tables() && theirs.tables():
			mine.list = append(mine.list, theirs.list...)
		default:
			report(finding.Finding{File: theirs.file, Line: theirs.line, What: fmt.Sprintf("%s is already set at %s:%d", key, mine.file, mine.line),
				Do: "set each key in one policy file"})
		}
	}
}

// tables tells whether the node is an array of tables.
func (n *node) tables() bool { return len(n.list) > 0 && n.list[0].table != nil }

// keys are the table's keys in the order in which they stand.
func (n *node) keys() []string {
	keys := make([]string, 0, len(n.table))
	for key := range n.table {
		keys = append(keys, key)
	}
	slices.SortFunc(keys, func(a, b string) int {
		if d := n.table[a].line - n.table[b].line; d != 0 {
			return d
		}
		return strings.Compare(a, b)
	})
	return keys
}
