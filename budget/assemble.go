package budget

import (
	"cmp"
	"fmt"
	"reflect"
	"slices"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/record"
)

// Runs combines parts into runs, each part once, in order of start and name.
// Parts without a readable open line belong to no run and are left over.
func (p *Policy) Runs(parts []*footprint.Part) (runs []*footprint.Run, stray []*footprint.Part) {
	type key struct {
		run     string
		attempt int
	}
	groups := map[key][]*footprint.Part{}
	var order []key
	for _, part := range parts {
		if !part.Opened() {
			stray = append(stray, part)
			continue
		}
		k := key{part.Open.Run, part.Open.Attempt}
		if groups[k] == nil {
			order = append(order, k)
		}
		groups[k] = append(groups[k], part)
	}
	for _, k := range order {
		runs = append(runs, p.run(groups[k]))
	}
	slices.SortStableFunc(stray, func(a, b *footprint.Part) int { return cmp.Compare(a.File, b.File) })
	slices.SortStableFunc(runs, func(a, b *footprint.Run) int {
		return cmp.Or(cmp.Compare(a.Start, b.Start), cmp.Compare(a.Run, b.Run), cmp.Compare(a.Attempt, b.Attempt))
	})
	return runs, stray
}

// run combines the parts of one attempt. The same part twice with the same
// content counts once; with other content, the one that measured less stands
// in, so that nothing is proven by a contradiction.
func (p *Policy) run(parts []*footprint.Part) *footprint.Run {
	slices.SortStableFunc(parts, func(a, b *footprint.Part) int {
		return cmp.Or(cmp.Compare(a.Open.Part, b.Open.Part), cmp.Compare(a.MeasuredEnergy(), b.MeasuredEnergy()), cmp.Compare(a.File, b.File))
	})
	var once []*footprint.Part
	var doubts []footprint.Doubt
	var notes []string
	for _, part := range parts {
		n := len(once)
		switch {
		case n == 0 || once[n-1].Open.Part != part.Open.Part:
			once = append(once, part)
		case sameContent(once[n-1], part):
			notes = append(notes, fmt.Sprintf("%s and %s are the same part of the same run: counted once", once[n-1].File, part.File))
		default:
			doubts = append(doubts, footprint.Doubt{Refutes: true,
				Reason: fmt.Sprintf("%s and %s are the same part of the same run with different content", once[n-1].File, part.File)})
		}
	}
	r := footprint.Combine(once, p.Method())
	r.Notes = append(r.Notes, notes...)
	r.Doubts = append(r.Doubts, doubts...)
	dropAbsurd(r)
	return r
}

// sameContent tells whether two parts tell of one record. A label that only
// one of them has, for booking filled it in, is no difference.
func sameContent(a, b *footprint.Part) bool {
	booked := a.Account != "" || b.Account != "" // the books do not tell how many lines could not count
	return a.Digest == b.Digest && a.End == b.End && a.Outcome == b.Outcome && (booked || a.Findings.Len() == b.Findings.Len()) &&
		reflect.DeepEqual(bare(a.Open, b.Open), bare(b.Open, a.Open)) && reflect.DeepEqual(a.Work, b.Work)
}

// bare is the open line without those labels that the other does not have.
func bare(o, other record.Open) record.Open {
	if other.Commit == "" {
		o.Commit = ""
	}
	if other.Branch == "" {
		o.Branch = ""
	}
	if other.Pull == 0 {
		o.Pull = 0
	}
	if len(o.Labels) == 0 {
		o.Labels = nil
	}
	o.Parts = max(o.Parts, 1)
	return o
}
