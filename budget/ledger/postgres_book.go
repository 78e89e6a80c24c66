package ledger

import (
	"context"
	"fmt"
	"maps"
	"slices"
	"strings"

	"github.com/jackc/pgx/v5"

	"budgetcheck/budget/unit"
)

// Book enters entries and marks in one transaction. An error after the commit
// was sent leaves open whether they are in, and says so.
func (s *postgres) Book(ctx context.Context, entries []*Entry, marks []*Mark) ([]Answer, error) {
	d, err := newDraft(entries, marks)
	if err != nil || d.empty() {
		return nil, err
	}
	var b *booking
	err = s.transact(ctx, pgx.ReadWrite, func(ctx context.Context, tx pgx.Tx) error {
		b = &booking{entries: d.entries, marks: d.marks}
		if err := b.look(ctx, tx); err != nil {
			return err
		}
		b.decide()
		return b.write(ctx, tx)
	})
	if err != nil {
		return nil, s.failure("book into", err)
	}
	return b.answers, nil
}

// booking is one transaction of Book.
type booking struct {
	entries []*Entry
	marks   []*Mark

	// What the tables hold: the last lines of the repositories, and in force
	// all the parts of the attempts concerned.
	heads  map[string]headRow
	before map[Key]kept
	known  map[id]bool // marks

	// What is to be written.
	after   map[Key]kept
	lines   []lineRow
	answers []Answer
	fresh   []markRow
}

// headRow is the last line of a repository.
type headRow struct {
	n        int64
	bookedAt unit.Instant
	chain    id
}

type lineRow struct {
	repository string
	n          int64
	body       string
	chain      id
}

type markRow struct {
	*Mark
	n int64
}

// look reads what the answers depend on.
func (b *booking) look(ctx context.Context, tx pgx.Tx) error {
	b.heads, b.before, b.known = map[string]headRow{}, map[Key]kept{}, map[id]bool{}
	var batch pgx.Batch
	batch.Queue("SELECT repository, n, booked_at, chain FROM ledger_heads WHERE repository = ANY($1)", b.repositories()).
		Query(rows4(func(repository string, n, at int64, chain id) error {
			b.heads[repository] = headRow{n, unit.Instant(at), chain}
			return nil
		}))
	batch.Queue("SELECT e.n, l.body FROM ledger_entries e JOIN ledger_lines l ON l.repository = e.repository AND l.n = e.n"+
		" WHERE e.attempt_id = ANY($1)", b.attempts()).
		Query(rows2(func(n int64, body string) error {
			e, err := parsed(body)
			if err == nil {
				b.before[e.Key()] = kept{e, n}
			}
			return err
		}))
	batch.Queue("SELECT id FROM ledger_marks WHERE id = ANY($1)", b.markIDs()).
		Query(rows1(func(m id) error { b.known[m] = true; return nil }))
	return tx.SendBatch(ctx, &batch).Close()
}

// parsed reads an entry as it was booked.
func parsed(body string) (*Entry, error) {
	l, err := parse([]byte(body))
	if err == nil && l.entry == nil {
		err = errKind
	}
	if err != nil {
		return nil, fmt.Errorf("a line of it %w; vet the ledger, which finds such lines", err)
	}
	return l.entry, nil
}

func (b *booking) repositories() []string {
	names := map[string]bool{}
	for _, e := range b.entries {
		names[cell(e.Repository)] = true
	}
	for _, m := range b.marks {
		names[cell(m.Repository)] = true
	}
	return slices.Sorted(maps.Keys(names))
}

func (b *booking) attempts() []id {
	ids := make([]id, len(b.entries))
	for n, e := range b.entries {
		ids[n] = e.attempt().id()
	}
	return ids
}

func (b *booking) markIDs() []id {
	ids := make([]id, len(b.marks))
	for n, m := range b.marks {
		ids[n] = m.id()
	}
	return ids
}

// decide answers for the entries, in their order.
func (b *booking) decide() {
	b.after = maps.Clone(b.before)
	b.answers = make([]Answer, len(b.entries))
	for n, e := range b.entries {
		b.answers[n] = answer(e, b.after[e.Key()].Entry)
		if b.answers[n].entered() {
			b.enter(*e)
		}
	}
	for _, m := range b.marks {
		if !b.known[m.id()] {
			b.known[m.id()] = true
			b.fresh = append(b.fresh, markRow{m, b.append(m.Repository, line{mark: m, booked: m.At})})
		}
	}
}

// enter takes a copy of an entry, for the transaction may fail.
func (b *booking) enter(e Entry) {
	n := b.append(e.Repository, line{entry: &e, booked: max(e.BookedAt, e.End)})
	b.after[e.Key()] = kept{&e, n}
}

// append gives a line the next number of its repository. It is booked no
// earlier than the one before it.
func (b *booking) append(repository string, l line) int64 {
	h := b.heads[cell(repository)]
	h.n++
	h.bookedAt = max(h.bookedAt, l.booked)
	if l.booked = h.bookedAt; l.entry != nil {
		l.entry.BookedAt = h.bookedAt
	}
	body := strings.TrimSpace(string(l.append(nil)))
	h.chain = chained(h.chain, body)
	b.heads[cell(repository)] = h
	b.lines = append(b.lines, lineRow{cell(repository), h.n, body, h.chain})
	return h.n
}
