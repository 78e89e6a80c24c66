package main

import (
	"context"
	"errors"
	"strings"

	"budgetcheck/budget"
	"budgetcheck/budget/ledger"
	"budgetcheck/report"
)

// forecast tells where the periods of budgets will end.
func forecast(args []string, s streams) (status int, err error) {
	var o options
	if err := o.parse("forecast", args, s, "policy", "grid", "ledger", "repo", "branch", "job", "enforce", "now", "json"); err != nil {
		return 0, err
	}
	if err := o.noRest(); err != nil {
		return 0, err
	}
	if len(o.job) > 1 || o.enforce && len(o.job) == 0 {
		return 0, errors.New("-enforce asks whether the next run of one job fits: name it with -job, once")
	}
	f, err := o.forecast(context.Background(), s)
	if err != nil {
		return 0, err
	}
	form := report.Forecast
	if o.json {
		form = report.ForecastJSON
	}
	if err := form(s.out, f); err != nil {
		return 0, err
	}
	if o.enforce && f.Fits != nil && !*f.Fits {
		return exitFinding, nil
	}
	return exitDone, nil
}

func (o *options) forecast(ctx context.Context, s streams) (*budget.Forecast, error) {
	c, l, from, err := o.booksCase(s)
	if err != nil {
		return nil, err
	}
	job := ""
	if len(o.job) == 1 {
		if job = o.job[0]; !l.policy.Knows(job) {
			return nil, errors.New("the policy does not know job " + job + "; add a [[job]], or name another with -job")
		}
	}
	err = withLedger(ctx, from, func(store ledger.Store) error { return l.readBooks(ctx, store, c) })
	if err != nil {
		return nil, err
	}
	f := l.policy.Forecast(*c, job)
	tell(s.err, l.notes...)
	return f, nil
}

// booksCase is a case that judges the books of a branch alone.
func (o *options) booksCase(s streams) (*budget.Case, *loader, surroundings, error) {
	from := surroundings{o, s.getenv}
	now, err := o.clock(s.clock)
	if err != nil {
		return nil, nil, from, err
	}
	policy, err := o.mustPolicy()
	if err != nil {
		return nil, nil, from, err
	}
	l := &loader{policy: policy}
	if err := l.readSeries(o); err != nil {
		return nil, nil, from, err
	}
	branch := from.branch()
	if branch == "" {
		return nil, nil, from, errors.New("-branch is missing: budgets belong to branches")
	}
	return &budget.Case{Branch: branch, Now: now, PolicySource: strings.Join(policy.Files, " and "), Repository: from.repository()}, l, from, nil
}

// withLedger opens the ledger for a while.
func withLedger(ctx context.Context, from surroundings, do func(ledger.Store) error) error {
	store, err := openLedger(ctx, from)
	if err != nil {
		return err
	}
	return errors.Join(do(store), store.Close())
}
