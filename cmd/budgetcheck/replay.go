package main

import (
	"context"
	"strings"

	"budgetcheck/budget"
	"budgetcheck/budget/ledger"
	"budgetcheck/report"
)

// replay judges the past changes in the ledger by a policy, and by one that is
// to be tried beside it.
func replay(args []string, s streams) (int, error) {
	var o options
	if err := o.parse("replay", args, s, "policy", "beside", "grid", "ledger", "repo", "branch", "now", "json"); err != nil {
		return 0, err
	}
	if err := o.noRest(); err != nil {
		return 0, err
	}
	ctx := context.Background()
	c, l, from, err := o.booksCase(s)
	if err != nil {
		return 0, err
	}
	var read *ledger.Books
	err = withLedger(ctx, from, func(store ledger.Store) (err error) {
		read, err = store.Read(ctx, ledger.Query{Repository: c.Repository})
		return err
	})
	if err != nil {
		return 0, err
	}
	if l.policy.NeedsTags(c.Branch) {
		c.Tags = l.tags(ctx, c.Branch)
	}
	beside, err := o.tried()
	if err != nil {
		return 0, err
	}
	r := budget.NewReplay(read, *c, budget.Replayed{Policy: l.policy, Set: l.set, Source: c.PolicySource}, beside)
	r.Notes = append(r.Notes, l.notes...)
	if o.json {
		return exitDone, report.ReplayJSON(s.out, r)
	}
	return exitDone, report.Replay(s.out, r)
}

// tried is the policy to set beside the one in force; nil if none is named.
func (o *options) tried() (*budget.Replayed, error) {
	if len(o.beside) == 0 {
		return nil, nil
	}
	other := *o
	other.policy = o.beside
	policy, err := other.mustPolicy()
	if err != nil {
		return nil, err
	}
	l := &loader{policy: policy}
	if err := l.readSeries(&other); err != nil {
		return nil, err
	}
	return &budget.Replayed{Policy: policy, Set: l.set, Source: strings.Join(policy.Files, " and ")}, nil
}
