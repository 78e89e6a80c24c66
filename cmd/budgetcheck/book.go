package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"slices"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/inputs"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// book enters runs, release marks and late prices into the ledger.
func book(args []string, s streams) (int, error) {
	var o options
	if err := o.parse("book", args, s, "policy", "head", "grid", "ledger", "repo", "branch", "pull", "commit", "run", "attempt", "part", "parts",
		"release", "settle", "correct", "now", "json"); err != nil {
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

// progress shows how far a long step is, where somebody watches.
type progress struct {
	w    io.Writer // nil where nobody does
	what string
	n    int
}

// newProgress watches only on a terminal: a log keeps every line.
func newProgress(w io.Writer, what string) *progress {
	f, ok := w.(*os.File)
	if !ok {
		return &progress{}
	}
	if info, err := f.Stat(); err != nil || info.Mode()&os.ModeCharDevice == 0 {
		return &progress{}
	}
	return &progress{w: w, what: what}
}

// step counts one file.
func (p *progress) step(*record.Reader, *footprint.Part) {
	if p.n++; p.w != nil {
		fmt.Fprintf(p.w, "\r%s %d", p.what, p.n)
	}
}

// done ends the line.
func (p *progress) done() {
	if p.w != nil && p.n > 0 {
		fmt.Fprintln(p.w)
	}
}
