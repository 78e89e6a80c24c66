package budget

import (
	"fmt"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/inputs"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// Unpriced is what stands in where no policy is at hand, on a node without a
// checkout: what the meters measured is booked, and is priced when it is read.
func Unpriced() *Policy { return defaults() }

// Booking says how parts are entered.
type Booking struct {
	Repository string
	Branch     string // that runs are charged to; empty: the record's
	Pull       int    // that runs are charged to instead; 0: the record's, where Branch is empty
	Now        unit.Instant
	Commits    map[string]inputs.Tree // by full id, as far as they are at hand
}

// account is the one that a part is charged to; "" if nothing tells.
func (b Booking) account(o *record.Open) string {
	switch {
	case b.Pull > 0:
		return ledger.PullAccount(b.Pull)
	case b.Branch != "":
		return b.Branch
	case o.Pull > 0:
		return ledger.PullAccount(o.Pull)
	}
	return o.Branch
}

// Entry makes the ledger's entry of a part. It is an error if the part cannot
// be entered at all; what is only in doubt is entered with its doubts.
func (p *Policy) Entry(part *footprint.Part, b Booking) (*ledger.Entry, error) {
	account := b.account(&part.Open)
	switch {
	case !part.Opened():
		return nil, fmt.Errorf("%s cannot be entered: it has no readable open line, so it belongs to no run", part.File)
	case account == "":
		return nil, fmt.Errorf("%s cannot be entered: no branch or pull request is told to charge it to; set -branch or -pull", part.File)
	case part.End.Sub(b.Now) > skew:
		return nil, fmt.Errorf("%s cannot be entered: run %s ends in the future, at %s; set the clocks right", part.File, part.Open.Run, part.End)
	}
	job := p.job(part.Open.Job, part.Open.Stage)
	if job != nil && job.Work != nil {
		part.Pilot = part.Pilot || part.Unfinished(job.Work.Amount)
	}
	e := &ledger.Entry{Kind: ledger.KindRun, Repository: b.Repository, Account: account, BookedAt: max(b.Now, part.End),
		Facts: part.FactsHash(p.Method()), Thin: p.thinPart(part), Booked: part.Book(p.Method())}
	if t, ok := b.Commits[part.Open.Commit]; ok && job != nil {
		e.Inputs = newStanding(p, &Case{}).inputs(job, part.Open.Commit, t)
	}
	return e, nil
}

// thinPart is why a part by itself is too thin; "" if it is not.
func (p *Policy) thinPart(part *footprint.Part) string {
	if doubts := p.thin(footprint.Combine([]*footprint.Part{part}, p.Method())); len(doubts) > 0 {
		return doubts[0].Reason
	}
	return ""
}

// Settle makes the corrections for entries that had no final price: their
// hours are priced with the series that have arrived since.
func (p *Policy) Settle(entries []*ledger.Entry, set *grid.Set, now unit.Instant) (corrections []*ledger.Entry) {
	look := func(o *record.Open) footprint.Facts { return p.facts(o, set) }
	for _, e := range entries {
		again, settled := e.Settle(e.Key().String(), p.Method(), look)
		if !settled {
			continue
		}
		c := *e
		c.Booked, c.Corrects, c.Why, c.BookedAt = again, e.ID(), "settled: the series has arrived", now
		corrections = append(corrections, &c)
	}
	return corrections
}
