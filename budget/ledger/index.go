package ledger

import (
	"slices"
	"sort"

	"budgetcheck/budget/unit"
)

// account is the entries of one account, in order of start.
type account struct {
	entries []*Entry
	longest unit.Duration // of any of them
}

// within are entries that may touch the window, in order of start: of its
// account, or of all where it names none.
func (b *Books) within(w Window) []*Entry {
	if b.accounts == nil {
		b.index()
	}
	a := b.accounts[w.Account]
	if a == nil {
		return nil
	}
	from := sort.Search(len(a.entries), func(n int) bool { return a.entries[n].Start >= w.From.Add(-a.longest) })
	to := sort.Search(len(a.entries), func(n int) bool { return a.entries[n].Start >= w.To })
	return a.entries[from:max(from, to)]
}

// index files the entries under their accounts, and all under "", and counts
// the parts of runs.
func (b *Books) index() {
	b.accounts, b.parts = map[string]*account{}, map[attempt]int{}
	for _, e := range b.Entries {
		b.parts[e.attempt()]++
		for _, name := range slices.Compact([]string{e.Account, ""}) {
			a := b.accounts[name]
			if a == nil {
				a = &account{}
				b.accounts[name] = a
			}
			a.entries = append(a.entries, e)
			a.longest = max(a.longest, e.End.Sub(e.Start))
		}
	}
}
