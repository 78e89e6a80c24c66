package main

import (
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
	"budgetcheck/report"
)

// gate judges head runs and writes the statement.
func gate(args []string, s streams) (int, error) {
	var o options
	err := o.parse("gate", args, s, "policy", "head", "base", "grid", "job", "branch", "pull", "commit", "base-commit", "now", "out", "json")
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
	c := budget.Case{Branch: o.branch, Pull: o.pull, Jobs: o.job, HeadCommit: o.commit, BaseCommit: o.baseCommit, Now: now,
		PolicySource: strings.Join(policy.Files, " and ")}
	if err := l.sides(&c, o.head, o.base, "-"); err != nil {
		return nil, err
	}
	tellFindings(s.err, l, c.Head, c.Base)
	c.Commits = l.commits(o, c.Head, c.Base)
	c.Notes = l.notes
	return policy.Judge(c), nil
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
