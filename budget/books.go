package budget

import (
	"slices"
	"sort"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/forecast"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// Books is what the ledger tells a judgement: the parts in the books, restated
// with the facts in force, the release marks, and what accounts spent.
type Books struct {
	ledger  *ledger.Books
	all     []*footprint.Part // in order of start
	account map[string][]*footprint.Part
	commit  map[string][]*footprint.Part
	inputs  map[string][]*footprint.Part
	key     map[partKey]*footprint.Part
	longest unit.Duration // of any part
	known   forecast.Known
}

// Books restates what was read of a ledger with the policy's facts. The series
// are for those entries that tell no zone.
func (p *Policy) Books(read *ledger.Books, set *grid.Set) *Books {
	b := &Books{ledger: read, account: map[string][]*footprint.Part{}, commit: map[string][]*footprint.Part{}, inputs: map[string][]*footprint.Part{},
		key: map[partKey]*footprint.Part{}}
	look := func(o *record.Open) footprint.Facts { return p.facts(o, set) }
	for _, e := range read.Entries {
		part := e.Restore(e.Key().String()+" of the books", p.Method(), look)
		part.Account, part.Inputs = e.Account, e.Inputs
		b.add(part)
	}
	return b
}

func (b *Books) add(part *footprint.Part) {
	b.all = append(b.all, part)
	b.key[keyOf(part)] = part
	b.account[part.Account] = append(b.account[part.Account], part)
	if c := part.Open.Commit; c != "" {
		b.commit[c] = append(b.commit[c], part)
	}
	if part.Inputs != "" {
		b.inputs[part.Inputs] = append(b.inputs[part.Inputs], part)
	}
	b.longest = max(b.longest, part.End.Sub(part.Open.At))
}

// before are those of the parts, which are in order of start, that started
// before t.
func before(parts []*footprint.Part, t unit.Instant) []*footprint.Part {
	return parts[:sort.Search(len(parts), func(n int) bool { return parts[n].Open.At >= t })]
}

// around are the parts of any account that were going on at some time between
// from and to.
func (b *Books) around(from, to unit.Instant) []*footprint.Part {
	first := sort.Search(len(b.all), func(n int) bool { return b.all[n].Open.At >= from.Add(-b.longest) })
	return slices.DeleteFunc(slices.Clone(before(b.all[first:], to)), func(p *footprint.Part) bool { return p.End <= from })
}

// partKey names a part of a run.
type partKey struct {
	run     string
	attempt int
	part    string
}

func keyOf(p *footprint.Part) partKey { return partKey{p.Open.Run, p.Open.Attempt, p.Open.Part} }

// pool adds booked parts to given ones. A part that is given and booked alike
// is one part.
func pool(given, booked []*footprint.Part) []*footprint.Part {
	have := map[partKey]*footprint.Part{}
	for _, p := range given {
		have[keyOf(p)] = p
	}
	all := slices.Clone(given)
	for _, p := range booked {
		if g := have[keyOf(p)]; g != nil && sameContent(g, p) {
			g.Account, g.Inputs = p.Account, p.Inputs
			continue
		}
		all = append(all, p)
	}
	return all
}
