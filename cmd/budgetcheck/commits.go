package main

import (
	"context"
	"errors"
	"fmt"
	"slices"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/inputs"
	"budgetcheck/budget/ledger"
)

// mostCommits bounds how many commits that records name are looked up.
const mostCommits = 50

// readCommits lists the files of the head commit, of the merge base where
// there is one, and of the commits that records name. A commit that is named
// and not there is left out: the run that names it is then unproven. So is a
// branch: a run of last month would stand for what is on it today.
func readCommits(ctx context.Context, repo inputs.Repository, head, mergeBase string, parts ...[]*footprint.Part) (*budget.Commits, error) {
	c := &budget.Commits{Named: map[string]inputs.Tree{}}
	var err error
	if c.Head, err = repo.Tree(ctx, head); err != nil {
		return nil, fmt.Errorf("the head commit cannot be read: %w", err)
	}
	if mergeBase != "" {
		if c.Base, err = repo.Tree(ctx, mergeBase); err != nil {
			return nil, fmt.Errorf("the merge base cannot be read: %w", err)
		}
	}
	asked := map[string]bool{head: true}
	for _, p := range slices.Concat(parts...) {
		name := p.Open.Commit
		if asked[name] || !inputs.FullID(name) || len(asked) > mostCommits {
			continue
		}
		asked[name] = true
		t, err := repo.Tree(ctx, name)
		switch {
		case err == nil:
			c.Named[name] = t
		case !errors.Is(err, inputs.ErrUnknown):
			return nil, fmt.Errorf("commit %s, which %s names, cannot be looked up: %w", name, p.File, err)
		}
	}
	return c, nil
}

// nameMore adds commits that booked runs name. Those that are not there are
// left out, as far as they were not looked up before.
func nameMore(ctx context.Context, repo inputs.Repository, c *budget.Commits, ids []string) error {
	for _, id := range ids {
		if _, known := c.Named[id]; known || !inputs.FullID(id) || len(c.Named) > mostCommits {
			continue
		}
		t, err := repo.Tree(ctx, id)
		switch {
		case err == nil:
			c.Named[id] = t
		case !errors.Is(err, inputs.ErrUnknown):
			return fmt.Errorf("commit %s, which the books name, cannot be looked up: %w", id, err)
		}
	}
	return nil
}

// nameCommits looks the commits of booked runs up in the local clone.
func (l *loader) nameCommits(ctx context.Context, c *budget.Case) {
	if c.Commits == nil {
		return
	}
	git, err := inputs.OpenGit(ctx, ".")
	if err == nil {
		err = nameMore(ctx, git, c.Commits, c.Books.Unplaced(c))
	}
	if err != nil {
		l.notes = append(l.notes, err.Error())
	}
}

// tags are the releases of a branch that tags of the local clone tell of.
func (l *loader) tags(ctx context.Context, branch string) (marks []*ledger.Mark) {
	git, err := inputs.OpenGit(ctx, ".")
	if err != nil {
		return nil
	}
	tags, err := git.Tags(ctx, l.policy.Account.ReleaseTags, branch)
	if err != nil {
		l.notes = append(l.notes, fmt.Sprintf("tags are not read: %v", err))
	}
	for _, t := range tags {
		marks = append(marks, &ledger.Mark{Kind: ledger.KindRelease, Tag: t.Name, Commit: t.Commit, Branch: branch, At: t.At})
	}
	return marks
}

// commits reads the commits that the flags name from the local clone. Without
// one, runs stand for the head commit only if they ran on it; notes say so.
func (l *loader) commits(o *options, head, base []*footprint.Part) *budget.Commits {
	if o.commit == "" {
		return nil
	}
	c, err := l.clone(o, head, base)
	if err != nil {
		l.notes = append(l.notes, fmt.Sprintf("inputs are not compared, head runs must name the head commit itself: %v", err))
		return nil
	}
	return c
}

func (l *loader) clone(o *options, head, base []*footprint.Part) (*budget.Commits, error) {
	ctx := context.Background()
	git, err := inputs.OpenGit(ctx, ".")
	if err != nil {
		return nil, err
	}
	if l.policy.Prefix, err = git.Prefix(ctx); err != nil {
		return nil, err
	}
	mergeBase := ""
	if o.baseCommit != "" {
		if _, mergeBase, err = git.Meet(ctx, o.baseCommit, o.commit); err != nil {
			return nil, err
		}
	}
	return readCommits(ctx, git, o.commit, mergeBase, head, base)
}
