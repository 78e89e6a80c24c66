package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"slices"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/inputs"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/unit"
)

// book enters runs, release marks and late prices into the ledger.
func book(args []string, s streams) (int, error) {
	var o options
	if err := o.parse("book", args, s, "policy", "head", "grid", "ledger", "repo", "branch", "pull", "commit", "run", "attempt", "part", "parts",
		"release", "settle", "correct", "now"); err != nil {
		return 0, err
	}
	o.head = append(o.head, o.rest...)
	if len(o.head) == 0 && o.release == "" && !o.settle {
		return 0, errors.New("nothing to book; give records with -head, a tag with -release, or -settle")
	}
	b := &booking{o: &o, s: s, from: surroundings{&o, s.getenv}}
	return b.run(context.Background())
}

// booking is one run of the command.
type booking struct {
	o      *options
	s      streams
	from   surroundings
	now    unit.Instant
	store  ledger.Store
	l      *loader
	status int
}

func (b *booking) run(ctx context.Context) (status int, err error) {
	if b.now, err = b.o.clock(b.s.clock); err != nil {
		return 0, err
	}
	if b.l, err = b.o.bookingLoader(b.s); err != nil {
		return 0, err
	}
	if b.store, err = openLedger(ctx, b.from); err != nil {
		return 0, err
	}
	defer func() { err = errors.Join(err, b.store.Close()) }()
	for _, step := range []func(context.Context) error{b.runs, b.release, b.settle} {
		if err := step(ctx); err != nil {
			return 0, err
		}
	}
	return b.status, nil
}

// bookingLoader is a loader with the policy, or without one where there is
// none: then energies are booked, and priced when they are read.
func (o *options) bookingLoader(s streams) (*loader, error) {
	l := &loader{policy: budget.Unpriced()}
	if _, err := os.Stat(policyName); err == nil || len(o.policy) > 0 {
		if l.policy, err = o.mustPolicy(); err != nil {
			return nil, err
		}
	} else {
		tell(s.err, "no policy is at hand: energies are booked without a price; the gate prices them, and book -settle does for good")
	}
	return l, l.readSeries(o)
}

// openLedger opens the ledger that flags or environment name.
func openLedger(ctx context.Context, from surroundings) (ledger.Store, error) {
	where := from.ledger()
	if where == "" {
		return nil, errors.New("no ledger is named; set -ledger or BUDGETCHECK_LEDGER, like file:ledger.ndjson or git:budgetcheck-ledger")
	}
	store, err := ledger.Open(ctx, where)
	if err != nil {
		return nil, fmt.Errorf("the ledger cannot be opened: %w", err)
	}
	return store, nil
}

// runs enters the records that the flags name.
func (b *booking) runs(ctx context.Context) (err error) {
	if len(b.o.head) == 0 {
		return nil
	}
	if b.l.fill, err = b.from.fill(); err != nil {
		return err
	}
	progress := newProgress(b.s.err, "weighed")
	parts, err := b.l.weighAll(b.o.head, "records", progress.step)
	progress.done()
	if err != nil {
		return err
	}
	if found := tellFindings(b.s.err, b.l, parts); found || len(b.l.missing) > 0 {
		b.status = exitFinding
	}
	tell(b.s.err, b.l.missing...)
	return b.parts(ctx, parts)
}

// parts enters weighed parts.
func (b *booking) parts(ctx context.Context, parts []*footprint.Part) error {
	entries, err := b.entries(ctx, parts)
	if err != nil || len(entries) == 0 {
		return err
	}
	answers, err := b.store.Book(ctx, entries, nil)
	if err != nil {
		return fmt.Errorf("booking failed, and what is in is not known; book again, nothing is entered twice: %w", err)
	}
	if b.o.correct != "" && slices.Contains(answers, ledger.Refused) {
		if answers, err = b.corrected(ctx, entries, answers); err != nil {
			return err
		}
	}
	return b.tell(entries, answers)
}

// entries makes the entries; what cannot be entered is told.
func (b *booking) entries(ctx context.Context, parts []*footprint.Part) ([]*ledger.Entry, error) {
	pull, err := b.from.pull()
	if err != nil {
		return nil, err
	}
	// What flags and CI host tell comes before what a record says of itself.
	how := budget.Booking{Repository: b.from.repository(), Branch: b.from.branch(), Pull: pull, Now: b.now, Commits: b.trees(ctx, parts)}
	var entries []*ledger.Entry
	for _, p := range parts {
		e, err := b.l.policy.Entry(p, how)
		if err != nil {
			tell(b.s.err, err.Error())
			b.status = exitFinding
			continue
		}
		entries = append(entries, e)
	}
	return entries, nil
}

// trees are the commits that the parts ran on, as far as a clone is at hand.
// Without one the gate looks them up.
func (b *booking) trees(ctx context.Context, parts []*footprint.Part) map[string]inputs.Tree {
	git, err := inputs.OpenGit(ctx, ".")
	if err != nil {
		return nil
	}
	if b.l.policy.Prefix, err = git.Prefix(ctx); err != nil {
		return nil
	}
	trees := map[string]inputs.Tree{}
	for _, p := range parts {
		id := p.Open.Commit
		if _, known := trees[id]; known || !inputs.FullID(id) {
			continue
		}
		if t, err := git.Tree(ctx, id); err == nil {
			trees[id] = t
		}
	}
	return trees
}

// tell writes one line for each entry.
func (b *booking) tell(entries []*ledger.Entry, answers []ledger.Answer) error {
	for n, e := range entries {
		amount := "energy not known"
		switch {
		case e.Total != nil:
			amount = e.Total.String()
		case e.Measured != nil:
			amount = e.Measured.String() + " at the meters, not priced yet"
		}
		tell(b.s.out, fmt.Sprintf("%s: %s, %s to %s", answers[n], e.Key(), amount, e.Account))
		if answers[n] == ledger.Refused || answers[n] == ledger.Unfounded {
			b.status = exitFinding
		}
	}
	return nil
}
