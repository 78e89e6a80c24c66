package main

import (
	"context"
	"errors"
	"fmt"

	"budgetcheck/budget/ledger"
)

// corrected enters what was refused once more, as corrections.
func (b *booking) corrected(ctx context.Context, entries []*ledger.Entry, answers []ledger.Answer) ([]ledger.Answer, error) {
	var again []*ledger.Entry
	var at []int
	since := entries[0].Start
	for n, a := range answers {
		if a == ledger.Refused {
			again, at = append(again, entries[n]), append(at, n)
			since = min(since, entries[n].Start)
		}
	}
	read, err := b.store.Read(ctx, ledger.Query{Repository: b.from.repository(), Since: since - 1})
	if err != nil {
		return nil, err
	}
	inForce := map[ledger.Key]*ledger.Entry{}
	for _, e := range read.Entries {
		inForce[e.Key()] = e
	}
	for _, e := range again {
		if old := inForce[e.Key()]; old != nil {
			e.Corrects, e.Why = old.ID(), b.o.correct
		}
	}
	second, err := b.store.Book(ctx, again, nil)
	if err != nil {
		return nil, fmt.Errorf("correcting failed, and what is in is not known; do it again: %w", err)
	}
	for n, a := range second {
		answers[at[n]] = a
	}
	return answers, nil
}

// release enters a release mark.
func (b *booking) release(ctx context.Context) error {
	if b.o.release == "" {
		return nil
	}
	m := &ledger.Mark{Kind: ledger.KindRelease, Repository: b.from.repository(), Tag: b.o.release, Commit: b.from.commit(), Branch: b.from.branch(), At: b.now}
	if m.Branch == "" {
		return errors.New("-branch is missing: a release ends an account of a branch")
	}
	if _, err := b.store.Book(ctx, nil, []*ledger.Mark{m}); err != nil {
		return fmt.Errorf("the release cannot be entered: %w", err)
	}
	tell(b.s.out, fmt.Sprintf("booked: release %s of branch %s", m.Tag, m.Branch))
	return nil
}

// settle prices again what was booked before its series arrived.
func (b *booking) settle(ctx context.Context) error {
	if !b.o.settle {
		return nil
	}
	read, err := b.store.Read(ctx, ledger.Query{Repository: b.from.repository()})
	if err != nil {
		return err
	}
	corrections := b.l.policy.Settle(read.Entries, b.l.set, b.now)
	if len(corrections) == 0 {
		tell(b.s.out, "nothing to settle: every booked hour has the price of its series, or the series has not arrived")
		return nil
	}
	answers, err := b.store.Book(ctx, corrections, nil)
	if err != nil {
		return fmt.Errorf("settling failed, and what is in is not known; do it again: %w", err)
	}
	return b.tell(corrections, answers)
}
