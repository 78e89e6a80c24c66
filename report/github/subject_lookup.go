package github

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"slices"
	"strings"

	"github.com/google/go-github/v60/github"

	"budgetcheck/budget/inputs"
)

// ErrNoPull is wrapped where a run for a pull request belongs to none that is
// open and still has the run's commit as its head: it was merged, closed, or
// has newer commits. Then there is nothing to judge; the newer run will be.
var ErrNoPull = errors.New("no open pull request has this commit as its head")

// Complete asks the API for what the event and the inputs leave open. It asks
// nothing where they say all. It never picks: where the API does not have
// exactly one answer, that is an error, because a statement on the wrong pull
// request or by the wrong branch's rules is worse than none.
func (h *Host) Complete(ctx context.Context, s Subject) (Subject, error) {
	if !s.NeedsLookup {
		return s, nil
	}
	var err error
	switch {
	case s.Pull != 0:
		err = h.askPull(ctx, &s)
	case s.Event == eventRun && s.ofPull():
		err = h.findPull(ctx, &s)
	case s.Event == eventRun:
		err = h.askTag(ctx, &s)
	case s.Branch == "":
		err = errNoBranch(s.Tag)
	case s.Head == "":
		s.Head, err = h.tip(ctx, "heads/"+s.Branch)
	}
	if err != nil {
		return Subject{}, err
	}
	s.NeedsLookup = false
	return s, nil
}

// askPull completes a pull request whose number was given.
func (h *Host) askPull(ctx context.Context, s *Subject) error {
	got, _, err := h.client.PullRequests.Get(ctx, h.owner, h.repo, s.Pull)
	if err != nil {
		return fmt.Errorf("pull request %d: %w", s.Pull, unknown(err))
	}
	given := *s
	if err := s.take(got); err != nil {
		return err
	}
	switch {
	case s.Pull != given.Pull:
		return fmt.Errorf("the host answers with pull request %d where %d was asked for", s.Pull, given.Pull)
	case given.Event == eventRun && s.Head != given.Head:
		return fmt.Errorf("the input pull is %d, whose head is %s, but the run was for %s: %w", s.Pull, s.Head, given.Head, ErrNoPull)
	case given.Event == eventRun && given.Branch != "" && s.Branch != given.Branch:
		return fmt.Errorf("pull request %d is for the branch %s, not %s; leave the input branch out", s.Pull, shown(s.Branch), shown(given.Branch))
	case given.Branch != "" && s.Branch != given.Branch:
		s.Branch, s.Base = given.Branch, "" // the base was the tip of another branch
	}
	s.Stale = given.Head != "" && given.Head != s.Head
	s.Head = cmp.Or(given.Head, s.Head)
	return nil
}

// take fills in a pull request as the API has it.
func (s *Subject) take(p *github.PullRequest) error {
	var c checker
	c.pull(s, pullKeys{Number: p.GetNumber(), Head: side(p.GetHead()), Base: side(p.GetBase())})
	if c.err != nil {
		return fmt.Errorf("the host's answer on a pull request: %w", c.err)
	}
	return nil
}

func side(b *github.PullRequestBranch) sideKeys {
	keys := sideKeys{Ref: b.GetRef(), SHA: b.GetSHA()}
	if b.GetRepo() != nil {
		keys.Repo = &repositoryKeys{ID: b.Repo.GetID(), FullName: b.Repo.GetFullName()}
	}
	return keys
}

// findPull looks for the pull request that a run was for: by the branch it
// comes from, which is exact and works for forks, then by its commit, for which
// hosts list no pull requests of forks.
func (h *Host) findPull(ctx context.Context, s *Subject) error {
	var found []*github.PullRequest
	var err error
	if s.HeadOwner != "" && s.HeadBranch != "" {
		found, err = h.pulls(ctx, s, func(page github.ListOptions) ([]*github.PullRequest, *github.Response, error) {
			from := &github.PullRequestListOptions{State: "open", Head: s.HeadOwner + ":" + s.HeadBranch, ListOptions: page}
			return h.client.PullRequests.List(ctx, h.owner, h.repo, from)
		})
	}
	if err == nil && len(found) == 0 {
		found, err = h.pulls(ctx, s, func(page github.ListOptions) ([]*github.PullRequest, *github.Response, error) {
			return h.client.PullRequests.ListPullRequestsWithCommit(ctx, h.owner, h.repo, s.Head, &page)
		})
	}
	switch {
	case err != nil && !errors.Is(err, inputs.ErrUnknown):
		return fmt.Errorf("pull requests of commit %s: %w", s.Head, err)
	case len(found) == 0:
		return fmt.Errorf("commit %s: %w", s.Head, ErrNoPull)
	case len(found) > 1:
		return fmt.Errorf("commit %s is the head of several pull requests (%s); say by the input branch which target is meant", s.Head, numbers(found))
	}
	return s.take(found[0])
}

// pulls are all pages of a list, as far as they can be what the run was for.
func (h *Host) pulls(ctx context.Context, s *Subject, list func(github.ListOptions) ([]*github.PullRequest, *github.Response, error)) (fit []*github.PullRequest, err error) {
	page := github.ListOptions{PerPage: 100}
	for {
		found, resp, err := list(page)
		if err != nil {
			return nil, unknown(err)
		}
		for _, p := range found {
			if h.fits(s, p) {
				fit = append(fit, p)
			}
		}
		if resp.NextPage <= page.Page {
			return fit, nil
		}
		page.Page = resp.NextPage
	}
}

// fits compares a pull request with all that is known of the run. Some hosts
// leave the filters of a query out of account.
func (h *Host) fits(s *Subject, p *github.PullRequest) bool {
	head, base := side(p.GetHead()), side(p.GetBase())
	here := &repositoryKeys{FullName: h.owner + "/" + h.repo}
	return p.GetState() == "open" &&
		base.Repo.is(here) &&
		head.SHA == s.Head &&
		head.Repo.is(here) == !s.Fork &&
		(s.HeadBranch == "" || head.Ref == s.HeadBranch) &&
		(s.HeadOwner == "" || strings.EqualFold(head.Repo.owner(), s.HeadOwner)) &&
		(s.Branch == "" || base.Ref == s.Branch)
}

func numbers(found []*github.PullRequest) string {
	var all []int
	for _, p := range found {
		all = append(all, p.GetNumber())
	}
	slices.Sort(all)
	return strings.Trim(fmt.Sprint(all), "[]")
}

// askTag settles whether a reported run was for a branch or for a tag. Where
// there are both, or neither any more, the event's word stands: a branch.
func (h *Host) askTag(ctx context.Context, s *Subject) error {
	_, err := h.tip(ctx, "heads/"+s.Branch)
	if !errors.Is(err, inputs.ErrUnknown) {
		return err
	}
	_, err = h.object(ctx, "tags/"+s.Branch)
	if errors.Is(err, inputs.ErrUnknown) {
		return nil
	}
	if err != nil {
		return err
	}
	s.Tag, s.Branch = s.Branch, s.DefaultBranch
	if s.Branch == "" {
		return errNoBranch(s.Tag)
	}
	return nil
}

func errNoBranch(tag string) error {
	return fmt.Errorf("the event does not say which branch the tag %s is on; name it by the input branch", shown(tag))
}
