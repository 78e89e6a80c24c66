package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/ledger"
	"budgetcheck/report"
)

// gate judges head runs and writes the statement.
func gate(args []string, s streams) (int, error) {
	var o options
	err := o.parse("gate", args, s, "policy", "head", "base", "grid", "job", "branch", "pull", "commit", "base-commit",
		"ledger", "repo", "book", "now", "out", "json")
	if err != nil {
		return 0, err
	}
	if err := o.noRest(); err != nil {
		return 0, err
	}
	if o.branch == "" {
		return 0, errors.New("-branch is missing: budgets belong to branches; with -pull it is the target branch")
	}
	statement, err := o.judge(s)
	if err != nil {
		return 0, err
	}
	if err := o.write(s.out, statement); err != nil {
		return 0, err
	}
	if statement.Gate == budget.Closed {
		return exitFinding, nil
	}
	return exitDone, nil
}

func (o *options) judge(s streams) (*budget.Statement, error) {
	now, err := o.clock(s.clock)
	if err != nil {
		return nil, err
	}
	policy, err := o.mustPolicy()
	if err != nil {
		return nil, err
	}
	l := &loader{policy: policy}
	if err := l.readSeries(o); err != nil {
		return nil, err
	}
	from := surroundings{o, s.getenv}
	if o.book {
		if l.fill, err = from.fill(); err != nil {
			return nil, err
		}
	}
	c := budget.Case{Branch: o.branch, Pull: o.pull, Jobs: o.job, HeadCommit: o.commit, BaseCommit: o.baseCommit, Now: now,
		PolicySource: strings.Join(policy.Files, " and "), Repository: from.repository()}
	if err := l.sides(&c, withoutLedger(o.head), o.base, "-"); err != nil {
		return nil, err
	}
	tellFindings(s.err, l, c.Head, c.Base)
	c.Commits = l.commits(o, c.Head, c.Base)
	if err := l.consult(context.Background(), from, &c, s); err != nil {
		return nil, err
	}
	c.Notes = l.notes
	return policy.Judge(c), nil
}

// fromLedger is what -head says for the runs in the books. They are pooled with
// given ones anyway, so that it only says so.
const fromLedger = "ledger:"

func withoutLedger(globs []string) []string {
	return slices.DeleteFunc(slices.Clone(globs), func(g string) bool { return g == fromLedger })
}

// consult books the head runs, where that is asked for, and reads from the
// ledger what the case takes. Without a ledger the case has no books.
func (l *loader) consult(ctx context.Context, from surroundings, c *budget.Case, s streams) (err error) {
	if from.ledger() == "" {
		if from.o.book || slices.Contains(from.o.head, fromLedger) {
			return errors.New("no ledger is named to book in or to read; set -ledger or BUDGETCHECK_LEDGER")
		}
		return nil
	}
	store, err := openLedger(ctx, from)
	if err != nil {
		return err
	}
	defer func() { err = errors.Join(err, store.Close()) }()
	if from.o.book {
		b := &booking{o: from.o, s: streams{out: s.err, err: s.err, clock: s.clock, getenv: s.getenv}, from: from, now: c.Now, store: store, l: l}
		if err := b.parts(ctx, c.Head); err != nil {
			return err
		}
	}
	return l.readBooks(ctx, store, c)
}

// readBooks reads what the case takes, and the commits that booked runs name.
func (l *loader) readBooks(ctx context.Context, store ledger.Store, c *budget.Case) error {
	if l.policy.NeedsTags(c.Branch) {
		c.Tags = l.tags(ctx, c.Branch)
	}
	read, err := l.policy.Consult(ctx, store, c, l.set)
	if err != nil {
		return fmt.Errorf("the ledger cannot be read: %w", err)
	}
	c.Books = read
	l.notes = append(l.notes, read.Notes()...)
	l.nameCommits(ctx, c)
	return nil
}

// tellFindings lists what is wrong in series and records, file by file. It
// tells whether anything is.
func tellFindings(w io.Writer, l *loader, sides ...[]*footprint.Part) bool {
	var lines []string
	for _, f := range l.series {
		lines = append(lines, f.Findings.Lines()...)
	}
	for _, f := range l.unread {
		lines = append(lines, f.String())
	}
	for _, parts := range sides {
		for _, p := range parts {
			lines = append(lines, p.Findings.Lines()...)
		}
	}
	tell(w, lines...)
	return len(lines) > 0
}

// write prints the statement and, with -out, writes it in every form.
func (o *options) write(w io.Writer, s *budget.Statement) error {
	form := report.Text
	if o.json {
		form = report.JSON
	}
	if err := form(w, s); err != nil || o.out == "" {
		return err
	}
	if err := writeForms(o.out, s); err != nil {
		return fmt.Errorf("the statement cannot be written: %w", err)
	}
	return nil
}

func writeForms(dir string, s *budget.Statement) error {
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return err
	}
	forms := []struct {
		name string
		form func(io.Writer, *budget.Statement) error
	}{{"statement.md", report.Markdown}, {"statement.json", report.JSON}, {"statement.xml", report.JUnit}}
	for _, f := range forms {
		var text strings.Builder
		if err := f.form(&text, s); err != nil {
			return err
		}
		if err := os.WriteFile(filepath.Join(dir, f.name), []byte(text.String()), 0o666); err != nil {
			return err
		}
	}
	return nil
}
