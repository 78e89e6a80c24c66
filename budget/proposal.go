package budget

import (
	"fmt"
	"slices"
	"strings"

	"budgetcheck/budget/finding"
)

// Edit is one difference between the policy in force and the head's.
type Edit struct {
	Table string `json:"table"`
	Key   string `json:"key"`
	From  string `json:"from,omitempty"` // empty: not there
	To    string `json:"to,omitempty"`
}

// Proposal is the head's own policy, which takes effect after merge.
type Proposal struct {
	Edits    []Edit
	Findings []finding.Finding // why it cannot be used; it closes the gate
	Preview  *Statement        // what it would make of the change; nil if it cannot be used or is the same
}

// Propose adds the head's policy to the statement. It changes no ruling; one
// that cannot be read would stop every later change and closes the gate.
func (s *Statement) Propose(p Proposal) {
	s.Edits, s.Preview = p.Edits, p.Preview
	for _, f := range p.Findings {
		s.Rulings = append(s.Rulings, Ruling{Kind: KindEvidence, Name: "policy of the head", Branch: s.Branch, State: Unproven,
			Reason: f.String(), PolicyLine: f.Line, PolicyFile: f.File})
	}
	if len(p.Findings) > 0 {
		s.broken, s.unruled = true, false
	}
	s.verdict()
}

// PolicyEdits compares two policies key by key. Either may be unreadable; what
// can be read is compared.
func PolicyEdits(base, head []PolicyFile) (edits []Edit) {
	from, to := settings(base), settings(head)
	for _, k := range from.order {
		if to.text[k] != from.text[k] {
			edits = append(edits, Edit{k.table, k.key, from.text[k], to.text[k]})
		}
	}
	for _, k := range to.order {
		if _, ok := from.text[k]; !ok {
			edits = append(edits, Edit{Table: k.table, Key: k.key, To: to.text[k]})
		}
	}
	return edits
}

// setting is where a value stands: tables in an array go by their name.
type setting struct{ table, key string }

// settingList is the values of a policy in the order in which they stand.
type settingList struct {
	order []setting
	text  map[setting]string
	names map[string]int // how many tables in arrays go by it
}

func settings(files []PolicyFile) settingList {
	l := settingList{text: map[setting]string{}, names: map[string]int{}}
	for _, f := range files {
		if n, bad := parseDocument(f.Data, f.Name); bad == nil {
			l.table(n, "")
		}
	}
	return l
}

func (l *settingList) table(n *node, name string) {
	for _, key := range n.keys() {
		switch inner := n.table[key]; {
		case inner.table != nil:
			l.table(inner, qualified(name, key))
		case inner.tables():
			for i, item := range inner.list {
				l.table(item, l.unlike(fmt.Sprintf("%s %q", qualified(name, key), item.called(i))))
			}
		default:
			k := setting{name, key}
			if _, twice := l.text[k]; !twice {
				l.order = append(l.order, k)
			}
			l.text[k] = inner.print()
		}
	}
}

// unlike tells tables of one name apart, so that none hides an edit of another:
// a job may have one for each stage, a rule several waivers.
func (l *settingList) unlike(name string) string {
	l.names[name]++
	if n := l.names[name]; n > 1 {
		return fmt.Sprintf("%s (%d)", name, n)
	}
	return name
}

// called is what a table in an array goes by: its name or the rule it names.
func (n *node) called(index int) string {
	for _, key := range []string{"name", "rule"} {
		if inner := n.table[key]; inner != nil && inner.value != nil {
			return fmt.Sprint(inner.value)
		}
	}
	return fmt.Sprint(index + 1)
}

// print is the value as text; lists in brackets.
func (n *node) print() string {
	if n.list == nil {
		return fmt.Sprint(n.value)
	}
	var items []string
	for _, item := range n.list {
		items = append(items, item.print())
	}
	return "[" + strings.Join(items, ", ") + "]"
}

// Changed are the rulings that the head's policy would make otherwise.
func (s *Statement) Changed() (changed []Ruling) {
	if s.Preview == nil {
		return nil
	}
	for _, r := range s.Preview.Rulings {
		same := slices.ContainsFunc(s.Rulings, func(o Ruling) bool {
			return o.Kind == r.Kind && o.Name == r.Name && o.Job == r.Job && o.State == r.State && o.LimitText == r.LimitText
		})
		if !same {
			changed = append(changed, r)
		}
	}
	return changed
}
