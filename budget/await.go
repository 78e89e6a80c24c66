package budget

import (
	"slices"

	"budgetcheck/budget/footprint"
)

// Awaits tells whether nothing but records that are still to come keeps the
// gate closed.
func (s *Statement) Awaits() bool {
	return s.Gate == Closed && !s.broken && !slices.ContainsFunc(s.Rulings, func(r Ruling) bool {
		return r.State == Over || r.State == Unproven && !r.Missing
	})
}

// Warns tells whether unproven rulings leave the gate open, by the policy. A
// policy of the head that cannot be used closes it all the same.
func (s *Statement) Warns() bool { return s.warns && !s.broken }

// onlyMissing tells whether all doubts would be settled by further records.
func onlyMissing(doubts []footprint.Doubt) bool {
	return !slices.ContainsFunc(doubts, func(d footprint.Doubt) bool { return !d.Missing })
}

// Find is where the policy has the rule of a ruling: its line may be another
// than in the policy that ruled. ok is false where it has none.
func (p *Policy) Find(r Ruling) (at Place, ok bool) {
	switch r.Kind {
	case KindBudget:
		return place(p.Budgets, func(b *Budget) (string, Place) { return b.Name, b.Place }, r.Name)
	case KindRegression:
		return place(p.Regressions, func(g *Regression) (string, Place) { return g.Name, g.Place }, r.Name)
	}
	if at, ok := place(p.Jobs, func(j *Job) (string, Place) { return j.Name, j.Place }, r.Job); ok {
		return at, true
	}
	return p.Evidence.Place, p.Evidence.Line > 0
}

func place[T any](tables []T, of func(T) (string, Place), name string) (Place, bool) {
	for _, t := range tables {
		if n, at := of(t); n == name {
			return at, true
		}
	}
	return Place{}, false
}
