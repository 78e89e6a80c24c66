package ledger

import (
	"cmp"
	"slices"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/unit"
)

// Books is what was read of a ledger: a value that nothing changes. Entries are
// those in force, in order of start; marks in order of time.
type Books struct {
	Entries []*Entry
	Marks   []*Mark
	Since   unit.Instant // complete for runs that ended after it

	// Findings are lines that cannot be read: what they tell is missing from
	// Entries and Marks.
	Findings finding.List
	Notes    []string // what was settled without loss of truth

	// Added are windows that the store added up by itself; its entries need not
	// be among Entries.
	Added map[Window]Spending

	accounts map[string]*account // index of Entries, made when it is needed
	parts    map[attempt]int     // how many are booked; from the same index
}

// sort brings entries and marks in order.
func (b *Books) sort() {
	slices.SortStableFunc(b.Entries, func(x, y *Entry) int {
		return cmp.Or(cmp.Compare(x.Start, y.Start), cmp.Compare(x.Run.Run, y.Run.Run), cmp.Compare(x.Attempt, y.Attempt), cmp.Compare(x.part(), y.part()))
	})
	slices.SortStableFunc(b.Marks, func(x, y *Mark) int { return cmp.Or(cmp.Compare(x.At, y.At), cmp.Compare(x.Tag, y.Tag)) })
}

// keeps tells whether the query asks for the entry, Last aside.
func (q *Query) keeps(e *Entry) bool {
	return !q.OnlyMarks && (q.Repository == "" || e.Repository == "" || e.Repository == q.Repository) &&
		(len(q.Accounts) == 0 || slices.Contains(q.Accounts, e.Account)) &&
		e.End > q.Since && (q.Until == 0 || e.Start < q.Until) &&
		(len(q.Inputs)+len(q.Commits)+len(q.Digests) == 0 || slices.Contains(q.Inputs, e.Inputs) ||
			slices.Contains(q.Commits, e.Commit) || slices.Contains(q.Digests, e.Digest))
}

// keepsMark tells whether the query asks for the mark.
func (q *Query) keepsMark(m *Mark) bool {
	return (q.Repository == "" || m.Repository == "" || m.Repository == q.Repository) &&
		m.At >= q.Since && (q.Until == 0 || m.At < q.Until)
}

// Merge lays what several queries read together, each entry and mark once.
func Merge(all ...*Books) *Books {
	merged := &Books{}
	entries, marks := map[Key]bool{}, map[Mark]bool{}
	for n, b := range all {
		if merged.Since = max(merged.Since, b.Since); n == 0 {
			merged.Since = b.Since
		}
		for _, e := range b.Entries {
			if k := e.Key(); !entries[k] {
				entries[k] = true
				merged.Entries = append(merged.Entries, e)
			}
		}
		merged.Findings.Join(&b.Findings)
		for _, note := range b.Notes {
			if !slices.Contains(merged.Notes, note) {
				merged.Notes = append(merged.Notes, note)
			}
		}
		for _, m := range b.Marks {
			if !marks[*m] {
				marks[*m] = true
				merged.Marks = append(merged.Marks, m)
			}
		}
	}
	merged.sort()
	return merged
}
