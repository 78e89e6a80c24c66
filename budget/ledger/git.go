package ledger

import (
	"context"
	"errors"
	"fmt"
	"time"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/unit"
)

// gitStore keeps the books on an orphan branch of a git repository, one file
// for each UTC month in which runs ended. It uses git's plumbing alone: there
// is no checkout, and work tree, index, HEAD and other branches stay as they
// are. Each booking is a commit on top of the last; a push that comes too late
// is rejected, built again on what came first, and pushed again.
//
// What is fetched is kept in a bare repository of our own, for fetching one
// commit without its history or its files would turn the clone into a shallow
// and partial one.
type gitStore struct {
	name   string // of the ledger, for messages
	branch string
	ref    string    // where the last known state of the branch is
	remote string    // its address; empty: the branch is the clone's own
	home   string    // the clone's git folder, or where our repositories are kept
	set    []setting // settings of the clone that concern its remote
	env    []string
}

// openGit opens the ledger that [REMOTE#]BRANCH names, seen from the working
// directory.
func openGit(ctx context.Context, where string) (Store, error) { return openGitIn(ctx, ".", where) }

func (s *gitStore) Close() error { return nil }

// tries is how often a booking is pushed. Of n who book at once at least one
// gets through each time.
const tries = 200

// Book commits and pushes until the push is the first to come.
func (s *gitStore) Book(ctx context.Context, entries []*Entry, marks []*Mark) (answers []Answer, err error) {
	if d, err := newDraft(entries, marks); err != nil || d.empty() {
		return nil, err
	}
	for n := 1; ; n++ {
		var took time.Duration
		err := s.with(ctx, func(r *repo) error {
			began := time.Now()
			answers, err = r.book(ctx, entries, marks)
			took = time.Since(began)
			return err
		})
		switch {
		case err == nil:
			return answers, nil
		case !errors.Is(err, errLate) || n == tries:
			return nil, fmt.Errorf("book into the ledger %s: %w", s.name, err)
		}
		if err := waitAbout(ctx, backOff(n, took)); err != nil {
			return nil, fmt.Errorf("book into the ledger %s: others were faster %d times: %w", s.name, n, err)
		}
	}
}

// backOff is how long to wait after so many attempts, of which the last took
// this long: more the more there are who book, and never so little that
// everybody meets again within one attempt.
func backOff(n int, took time.Duration) time.Duration {
	const longest = 30 * time.Second
	for range min(n, 6) {
		took = took * 3 / 2
	}
	return min(took, longest)
}

// book makes one attempt.
func (r *repo) book(ctx context.Context, entries []*Entry, marks []*Mark) ([]Answer, error) {
	d, err := newDraft(entries, marks)
	if err != nil {
		return nil, err
	}
	tip, err := r.fetch(ctx)
	if err != nil {
		return nil, err
	}
	defer tip.close()
	months := tip.months(month(d.since()))
	if err := tip.load(ctx, months); err != nil {
		return nil, err
	}
	pages := map[string]*page{}
	for _, name := range months {
		p := &page{name: name}
		pages[name] = p
		for text := range lines(tip.text[name]) {
			d.read(text, p)
			if at, ok := bookedAt(text); ok {
				p.last = at
			}
		}
	}
	answers := d.settle(pageIn(pages))
	return answers, tip.commit(ctx, pages)
}

// pageIn finds the file of a moment's month, but none before the one that holds
// what the entry stands in for: whoever reads that one must meet the entry too.
func pageIn(pages map[string]*page) func(unit.Instant, *page) *page {
	return func(at unit.Instant, after *page) *page {
		name := month(at)
		if after != nil {
			name = max(name, after.name)
		}
		if pages[name] == nil {
			const beginning = unit.Instant(-1 << 63)
			pages[name] = &page{name: name, last: beginning}
		}
		return pages[name]
	}
}

// Read fetches the tip and the files of the months that may matter.
func (s *gitStore) Read(ctx context.Context, q Query) (*Books, error) {
	g := gather(q)
	err := s.with(ctx, func(r *repo) error {
		tip, err := r.fetch(ctx)
		if err != nil {
			return err
		}
		defer tip.close()
		months := tip.months(month(q.Since))
		if err := tip.load(ctx, months); err != nil {
			return err
		}
		for _, name := range months {
			no := 0
			for text := range lines(tip.text[name]) {
				no++
				g.line(text, s.branch+":"+name, func() int { return no })
			}
		}
		return nil
	})
	if err != nil {
		return nil, fmt.Errorf("read the ledger %s: %w", s.name, err)
	}
	return g.done(), nil
}

// Vet looks at every line, and at the history as far as it is there.
func (s *gitStore) Vet(ctx context.Context) (*finding.List, error) {
	v := newVetting()
	err := s.withAll(ctx, func(r *repo) error { return r.vet(ctx, v) })
	if err != nil {
		return nil, fmt.Errorf("vet the ledger %s: %w", s.name, err)
	}
	return v.findings, nil
}
