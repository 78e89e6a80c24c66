package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"path"
	"slices"
	"strings"

	"budgetcheck/budget"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/inputs"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/unit"
	"budgetcheck/report/github"
)

// change is what the action judges: a subject, in a repository of which there
// may be no clone. Policy and series are read from commits, never from the
// working folder, where the code under review may have written.
type change struct {
	subject github.Subject
	repo    inputs.Repository
	in      actionInputs
	now     unit.Instant
	s       streams

	tip, mergeBase string // commits; mergeBase is empty where there is none
	base, head     inputs.Tree
	policy         *budget.Policy
	headPolicy     *budget.Policy // nil where it cannot be used
	files          []budget.PolicyFile
	headFiles      []budget.PolicyFile
	notes          []string
	store          ledger.Store // nil where there are no books
}

// mergeGroup is the event of a merge queue.
const mergeGroup = "merge_group"

// judge makes the statement.
func (c *change) judge(ctx context.Context) (statement *budget.Statement, err error) {
	if err := c.locate(ctx); err != nil {
		return nil, err
	}
	if err := c.policies(ctx); err != nil {
		return nil, err
	}
	if err := c.openBooks(ctx); err != nil {
		return nil, err
	}
	if c.store != nil {
		defer func() { err = errors.Join(err, c.store.Close()) }()
	}
	statement, err = c.by(ctx, c.policy)
	if err != nil {
		return nil, err
	}
	return statement, c.propose(ctx, statement)
}

// locate finds the commits: the tip whose policy rules, and the merge base.
// What is pushed is judged by the policy that was pushed with it.
func (c *change) locate(ctx context.Context) (err error) {
	s := c.subject
	switch {
	case s.Pull > 0 || s.Event == mergeGroup:
		ref := s.Branch
		if s.Event == mergeGroup {
			ref = s.Base
		}
		if c.tip, c.mergeBase, err = c.repo.Meet(ctx, ref, s.Head); err != nil {
			return fmt.Errorf("the tip of %s cannot be found: %w", ref, err)
		}
	case s.Base != "":
		c.tip = s.Head
		if _, c.mergeBase, err = c.repo.Meet(ctx, s.Base, s.Head); err != nil {
			c.notes = append(c.notes, "where the push left the branch is not known: every job is asked for a run")
			c.mergeBase = ""
		}
	default:
		c.tip = s.Head
	}
	if c.base, err = c.repo.Tree(ctx, c.tip); err != nil {
		return fmt.Errorf("the commit of the policy cannot be read: %w", err)
	}
	if c.head, err = c.repo.Tree(ctx, s.Head); err != nil {
		return fmt.Errorf("the head commit cannot be read: %w", err)
	}
	return nil
}

// adoption tells whether the target has no policy yet.
func (c *change) adoption() bool { return len(c.files) == 0 }

// ruling is the commit whose policy and series are in force. The target's has
// none yet where the change brings the first.
func (c *change) ruling() (commit string, t inputs.Tree) {
	if c.adoption() {
		return c.subject.Head, c.head
	}
	return c.tip, c.base
}

// policies reads the policy in force and the head's.
func (c *change) policies(ctx context.Context) (err error) {
	if c.files, err = c.policyFiles(ctx, c.base); err != nil {
		return err
	}
	if c.headFiles, err = c.policyFiles(ctx, c.head); err != nil {
		return err
	}
	inForce := c.policyInForce()
	if len(inForce) == 0 {
		return fmt.Errorf("there is no policy %s on branch %s nor in this change; budgetcheck init writes one", strings.Join(c.in.policy, ", "), c.subject.Branch)
	}
	var found []string
	policy, findings := budget.ParsePolicy(inForce...)
	for _, f := range findings {
		found = append(found, f.String())
	}
	if len(found) > 0 {
		at, _ := c.ruling()
		return fmt.Errorf("the policy at %s cannot be used; mend it there:\n%s", at, strings.Join(found, "\n"))
	}
	c.policy, c.headPolicy = policy, policy
	return c.absent()
}

// absent tells of policy files that are named and not in force: budgets that
// drop out must not do so in silence.
func (c *change) absent() error {
	named := func(files []budget.PolicyFile, name string) bool {
		return slices.ContainsFunc(files, func(f budget.PolicyFile) bool { return f.Name == name })
	}
	for _, name := range c.in.policy {
		name = path.Clean(name)
		switch {
		case named(c.policyInForce(), name):
		case named(c.headFiles, name):
			c.notes = append(c.notes, fmt.Sprintf("the policy %s is new in this change and takes effect after merge", name))
		default:
			return fmt.Errorf("there is no policy %s on branch %s nor in this change; mend the input policy", name, c.subject.Branch)
		}
	}
	return nil
}

// policyInForce is the target's policy, or the head's where it has none yet.
func (c *change) policyInForce() []budget.PolicyFile {
	if c.adoption() {
		return c.headFiles
	}
	return c.files
}

// policyFiles reads the policy files of a commit that are there.
func (c *change) policyFiles(ctx context.Context, t inputs.Tree) (files []budget.PolicyFile, err error) {
	for _, name := range c.in.policy {
		name = path.Clean(name)
		f, ok := t.Find(name)
		if !ok {
			continue
		}
		data, err := c.repo.Blob(ctx, f)
		if err != nil {
			return nil, fmt.Errorf("the policy cannot be read: %w", err)
		}
		files = append(files, budget.PolicyFile{Name: name, Data: data})
	}
	return files, nil
}

// by weighs and judges by one policy.
func (c *change) by(ctx context.Context, policy *budget.Policy) (*budget.Statement, error) {
	l := &loader{policy: policy, noLinks: true}
	if err := c.series(ctx, l); err != nil {
		return nil, err
	}
	about := budget.Case{Branch: c.subject.Branch, Pull: c.subject.Pull, Jobs: c.in.job, HeadCommit: c.subject.Head, BaseCommit: c.tip, Now: c.now,
		PolicySource: c.source(), Adoption: c.adoption(), Repository: c.repository(), MergeGroup: c.subject.Event == mergeGroup}
	err := l.sides(&about, c.in.head, c.in.base, "")
	if err != nil {
		return nil, err
	}
	if policy == c.policy {
		tellFindings(c.s.err, l, about.Head, about.Base)
	}
	if about.Commits, err = readCommits(ctx, c.repo, c.subject.Head, c.mergeBase, about.Head, about.Base); err != nil {
		return nil, err
	}
	if err := c.books(ctx, l, &about); err != nil {
		return nil, err
	}
	about.Notes = slices.Concat(c.notes, l.notes)
	return policy.Judge(about), nil
}

// source says which policy ruled.
func (c *change) source() string {
	at, _ := c.ruling()
	return fmt.Sprintf("%s at %.12s", strings.Join(c.policy.Files, " and "), at)
}

// series reads the series that the policy names from the commit in force, and
// those of the workspace that the inputs name.
func (c *change) series(ctx context.Context, l *loader) error {
	_, there := c.ruling()
	for _, f := range there.Match(l.policy.SeriesGlobs()...) {
		data, err := c.repo.Blob(ctx, f)
		if err != nil {
			return fmt.Errorf("the series cannot be read: %w", err)
		}
		file, err := grid.ReadCSV(bytes.NewReader(data), f.Path, l.policy.Grid.ColumnNames())
		if err != nil {
			return fmt.Errorf("the series cannot be read: %w", err)
		}
		l.series = append(l.series, file)
	}
	return l.finishSeries(c.in.grid)
}

// propose shows what the head's own policy would make of the change.
func (c *change) propose(ctx context.Context, s *budget.Statement) error {
	if c.adoption() || sameFiles(c.files, c.headFiles) {
		return nil
	}
	proposal := budget.Proposal{Edits: budget.PolicyEdits(c.files, c.headFiles)}
	policy, findings := budget.ParsePolicy(c.headFiles...)
	if len(c.headFiles) == 0 {
		s.Notes = append(s.Notes, "this change removes the policy: after merge, no branch has budgets until there is one again")
		c.headPolicy = nil
		s.Propose(proposal)
		return nil
	}
	if proposal.Findings = findings; len(findings) > 0 {
		c.headPolicy = nil
		s.Propose(proposal)
		return nil
	}
	c.headPolicy = policy
	preview, err := c.by(ctx, policy)
	if err != nil {
		return errors.Join(errors.New("the head's policy cannot be tried"), err)
	}
	proposal.Preview = preview
	s.Propose(proposal)
	return c.replay(ctx, s)
}

func sameFiles(a, b []budget.PolicyFile) bool {
	if len(a) != len(b) {
		return false
	}
	for n := range a {
		if a[n].Name != b[n].Name || !bytes.Equal(a[n].Data, b[n].Data) {
			return false
		}
	}
	return true
}

// line is where the head's policy has the rule of a ruling; the path is empty
// where it has none.
func (c *change) line(r budget.Ruling) (path string, line int) {
	if c.headPolicy == nil {
		return "", 0
	}
	at, ok := c.headPolicy.Find(r)
	if !ok {
		return "", 0
	}
	return at.File, at.Line
}
