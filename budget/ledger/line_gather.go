package ledger

import (
	"bytes"
	"errors"
	"fmt"
	"slices"

	"budgetcheck/budget/finding"
)

// gathering makes books of lines, which come in the order of their booking.
type gathering struct {
	q     Query
	books Books
	force force
	texts [][]byte // one of which a line must hold; empty: any line
	// unclosed are the runs of which an unclosed entry was met. What stands in
	// for it may be charged to another account, and counts all the same.
	unclosed map[string]bool
}

func gather(q Query) *gathering {
	g := &gathering{q: q, books: Books{Since: q.Since}, unclosed: map[string]bool{}}
	texts := slices.Concat(q.Inputs, q.Commits, q.Digests)
	if written(texts...) {
		for _, text := range texts {
			g.texts = append(g.texts, []byte(text))
		}
	}
	return g
}

// line takes a line; file and no are for findings.
func (g *gathering) line(text []byte, file string, no func() int) {
	if !g.wants(text) {
		return
	}
	l, err := parse(text)
	switch {
	case errors.Is(err, errKind): // vet tells of it
	case err != nil:
		g.books.Findings.Add(unreadable(file, no(), err))
	case l.mark != nil:
		if g.q.keepsMark(l.mark) {
			g.books.Marks = append(g.books.Marks, l.mark)
		}
	default:
		if !l.entry.Closed {
			g.unclosed[l.entry.Run.Run] = true
		}
		g.force.add(l.entry)
	}
}

// unreadable is the finding about a line that cannot be read.
func unreadable(file string, no int, err error) finding.Finding {
	return finding.Finding{File: file, Line: no, What: fmt.Sprintf("the line %s", err),
		Do: "put the line back from a copy of the ledger: until then what it told is missing from every figure"}
}

// wants tells whether a line may change the answer. Most that do not are told
// by their start.
func (g *gathering) wants(text []byte) bool {
	h, sure := scanHead(text)
	if sure && g.q.OnlyMarks {
		return false
	}
	if !sure || len(h.corrects) > 0 || g.unclosed[string(h.run)] {
		return true
	}
	if g.q.Repository != "" && len(h.repository) > 0 && string(h.repository) != g.q.Repository {
		return false
	}
	if len(g.q.Accounts) > 0 && !slices.Contains(g.q.Accounts, string(h.account)) {
		return false
	}
	holds := func(part []byte) bool { return bytes.Contains(text, part) }
	return len(g.texts) == 0 || slices.ContainsFunc(g.texts, holds)
}

// done gives the books.
func (g *gathering) done() *Books {
	b := &g.books
	for _, e := range g.force.list {
		if g.q.keeps(e) {
			b.Entries = append(b.Entries, e)
		}
	}
	b.sort()
	if g.q.Last > 0 {
		b.Entries = lastRuns(b.Entries, g.q.Last)
	}
	return b
}

// lastRuns keeps the last n runs of each account, job and stage of entries that
// are in order of start. A run is as new as its newest part.
func lastRuns(entries []*Entry, n int) []*Entry {
	type series struct{ account, job, stage string }
	kept := map[series]map[attempt]bool{}
	var list []*Entry
	for _, e := range slices.Backward(entries) {
		s := series{e.Account, e.Job, e.Stage}
		if kept[s] == nil {
			kept[s] = map[attempt]bool{}
		}
		if kept[s][e.attempt()] || len(kept[s]) < n {
			kept[s][e.attempt()] = true
			list = append(list, e)
		}
	}
	slices.Reverse(list)
	return list
}
