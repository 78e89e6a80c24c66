package main

import (
	"context"
	"errors"
	"fmt"

	"budgetcheck/budget"
	"budgetcheck/budget/inputs"
	"budgetcheck/budget/ledger"
)

// defaultLedger is where the action keeps its books: on a branch of their own,
// so that nothing has to be set up.
const defaultLedger = "git:budgetcheck-ledger"

func (c *change) repository() string { return surroundings{&options{}, c.s.getenv}.repository() }

// openBooks opens the ledger. Where none is named and the default one cannot be
// reached, there is none, which period budgets then say.
func (c *change) openBooks(ctx context.Context) (err error) {
	where := c.in.ledger
	if where == "" {
		where = defaultLedger
	}
	if c.store, err = ledger.Open(ctx, where); err == nil || c.in.ledger != "" || c.in.book {
		return err
	}
	c.store = nil
	c.notes = append(c.notes, c.noBooks(err)...)
	return nil
}

// noBooks says that there are none, where a rule asks for them.
func (c *change) noBooks(err error) []string {
	if !c.policy.NeedsBooks(c.subject.Branch) {
		return nil
	}
	return []string{fmt.Sprintf("there are no books: %v", err)}
}

// mostAsked is how many commits of booked runs are looked up: each may be a
// call to the code host.
const mostAsked = 10

// books enters the head runs, where that is asked for, and reads what the case
// takes. The account comes from the event, never from a record.
func (c *change) books(ctx context.Context, l *loader, about *budget.Case) error {
	if c.store == nil {
		return nil
	}
	if c.in.book && l.policy == c.policy && len(about.Head) > 0 {
		if err := c.enter(ctx, l, about); err != nil {
			return err
		}
	}
	if l.policy.NeedsTags(c.subject.Branch) {
		about.Tags = l.tags(ctx, c.subject.Branch)
	}
	read, err := l.policy.Consult(ctx, c.store, about, l.set)
	if err != nil && c.in.ledger == "" && !c.in.book {
		l.notes = append(l.notes, c.noBooks(err)...)
		return nil
	}
	if err != nil {
		return fmt.Errorf("the ledger cannot be read: %w", err)
	}
	about.Books = read
	l.notes = append(l.notes, read.Notes()...)
	unplaced := read.Unplaced(about)
	return nameMore(ctx, c.repo, about.Commits, unplaced[:min(len(unplaced), mostAsked)])
}

// enter books the head runs. A fork's token cannot; the workflow_run after it
// can.
func (c *change) enter(ctx context.Context, l *loader, about *budget.Case) error {
	if !c.subject.MayWrite() {
		l.notes = append(l.notes, "nothing is booked: the pull request comes from a fork, whose token only reads")
		return nil
	}
	how := budget.Booking{Repository: c.repository(), Branch: c.subject.Branch, Pull: c.subject.Pull, Now: c.now,
		Commits: map[string]inputs.Tree{c.subject.Head: c.head}}
	for id, t := range about.Commits.Named {
		how.Commits[id] = t
	}
	var entries []*ledger.Entry
	for _, p := range about.Head {
		e, err := l.policy.Entry(p, how)
		if err != nil {
			l.notes = append(l.notes, err.Error())
			continue
		}
		entries = append(entries, e)
	}
	answers, err := c.store.Book(ctx, entries, nil)
	if err != nil {
		return fmt.Errorf("booking failed, and what is in is not known; run the job again, nothing is entered twice: %w", err)
	}
	for n, a := range answers {
		if a == ledger.Refused || a == ledger.Unfounded {
			l.notes = append(l.notes, fmt.Sprintf("%s: %s; see budgetcheck book -correct", entries[n].Key(), a))
		}
	}
	return nil
}

// replay judges the past by the policy in force and by the one that the change
// proposes.
func (c *change) replay(ctx context.Context, s *budget.Statement) error {
	if c.store == nil || c.headPolicy == nil {
		return nil
	}
	read, err := c.store.Read(ctx, ledger.Query{Repository: c.repository()})
	if err != nil && c.in.ledger == "" {
		return nil // there are none, as was said
	}
	if err != nil {
		return fmt.Errorf("the ledger cannot be read: %w", err)
	}
	var tried [2]budget.Replayed
	for n, policy := range []*budget.Policy{c.policy, c.headPolicy} {
		l := &loader{policy: policy, noLinks: true}
		if err := c.series(ctx, l); err != nil {
			return errors.Join(errors.New("the past cannot be judged again"), err)
		}
		tried[n] = budget.Replayed{Policy: policy, Set: l.set, Source: []string{c.source(), "this change's own"}[n]}
	}
	about := budget.Case{Branch: c.subject.Branch, Now: c.now, Repository: c.repository()}
	s.Replay = budget.NewReplay(read, about, tried[0], &tried[1]).Differences()
	return nil
}
