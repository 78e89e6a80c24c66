package github

import (
	"cmp"
	"fmt"
	"strings"
)

// Subject is what an event asks to judge. Every value comes from the event or
// from the API: a record or an artifact could name any pull request.
type Subject struct {
	// Event is the event that started the workflow, as the host names it.
	Event string
	// Cause is the event that asked for the judged run. It differs from Event
	// only where a workflow_run reports the run of another workflow.
	Cause string
	// Branch is the branch whose rules apply: the target of a pull request or
	// merge group, else the branch that the run was for. Tags are judged by the
	// branch they were made on, or by the default branch if the event does not say.
	Branch string
	// Pull is the number of the pull request, 0 if there is none.
	Pull int
	// Pulls are all pull requests that Head brings in, as far as the event tells:
	// nil, or Pull alone. The ref of a merge group names only the last one of it.
	Pulls []int
	// Head is the full id of the commit to judge and to post to. It is never the
	// test-merge commit of a pull request.
	Head string
	// Base is the tip of the target at the event, or what a branch pointed to
	// before a push (which a forced push does not leave as an ancestor). It is
	// empty where the event knows none: new branches, tags, schedules, dispatches.
	Base string
	// Fork says that the head is not in this repository.
	Fork bool
	// HeadBranch and HeadOwner say where the head of a pull request comes from.
	// HeadOwner is empty if its repository is gone.
	HeadBranch, HeadOwner string
	// DefaultBranch is that of the repository, empty if the event does not say.
	DefaultBranch string
	// Tag is the tag that the run was for, empty if it was for a branch.
	Tag string
	// Stale says that the pull request has moved on from the given Head: the
	// statement is about that commit alone.
	Stale bool
	// NeedsLookup says that something above is missing which Complete can ask for.
	NeedsLookup bool
}

// MayWrite says whether the host lets anything be posted. A pull request of a
// fork runs with a token that only reads; what it is to post, the workflow_run
// after it posts.
func (s Subject) MayWrite() bool { return !s.Fork || s.Event != eventPull }

// CommentOn is the pull request that the statement is a comment on; 0 for none.
// A merge group is judged as a whole, and a commit that a pull request has left
// behind must not take the place of its newest: both have their check alone.
func (s Subject) CommentOn() int {
	if s.Cause == eventGroup || s.Stale {
		return 0
	}
	return s.Pull
}

// Called is the name of the check and the comment. What is judged by the rules
// of a branch that is not the default one, and for no pull request, must not
// pass for the verdict on a pull request that has the same head.
func (s Subject) Called(name string) string {
	if s.Pull > 0 || s.Cause == eventGroup || s.Branch == s.DefaultBranch {
		return name
	}
	return fmt.Sprintf("%s (%s)", cmp.Or(name, "budgetcheck"), s.Branch)
}

// With replaces what the event says by the action's inputs branch, pull and
// commit, for runs that were dispatched from elsewhere. An empty input was not
// given. What a given value makes doubtful is forgotten, and looked up later:
// another pull request has another branch and head, and a dispatch for another
// branch means the tip of that branch.
//
// A workflow_run is not told what it reports: inputs may fill in what its event
// leaves open, and Complete checks them against the API. They may have been read
// from an artifact, which the judged change has written.
func (s Subject) With(branch, pull, commit string) (Subject, error) {
	var c checker
	given := Subject{
		Branch: optional(branch, func(text string) string { return c.branch("the input branch", text) }),
		Pull:   optional(pull, func(text string) int { return c.number("the input pull", text) }),
		Head:   optional(commit, func(text string) string { return c.commit("the input commit", text) }),
	}
	if c.err != nil {
		return Subject{}, c.err
	}
	if s.Event == eventRun {
		return s.filledIn(given)
	}
	return s.replaced(given), nil
}

// optional checks an input that was given.
func optional[T any](text string, check func(string) T) (value T) {
	if text == "" {
		return value
	}
	return check(strings.TrimSpace(text))
}

func (s Subject) replaced(given Subject) Subject {
	if given.Pull != 0 && given.Pull != s.Pull {
		s = Subject{Event: s.Event, Cause: s.Cause, DefaultBranch: s.DefaultBranch}
		s.setPull(given.Pull)
	}
	if given.Branch != "" && given.Branch != s.Branch {
		if s.Pull != 0 {
			s.Base = "" // it was the tip of another branch
		}
		if dispatched(s.Cause) && s.Tag == "" {
			s.Head = "" // it was the tip of another branch
		}
		s.Branch = given.Branch
	}
	if given.Head != "" && given.Head != s.Head {
		if s.Pull == 0 {
			s.Base = "" // it was the base of another commit
		}
		s.Head = given.Head
	}
	s.NeedsLookup = s.Branch == "" || s.Head == ""
	return s
}

// filledIn takes only what the event leaves open. A pull request that was given
// is always looked up: its head must be the run's.
func (s Subject) filledIn(given Subject) (Subject, error) {
	var c checker
	if given.Head != "" && given.Head != s.Head {
		c.fail("the input commit is %s, but the run that this workflow_run reports was for %s; leave the input out", given.Head, s.Head)
	}
	if given.Pull != 0 && s.Pull != 0 && given.Pull != s.Pull {
		c.fail("the input pull is %d, but the event names pull request %d; leave the input out", given.Pull, s.Pull)
	}
	if given.Branch != "" && s.Branch != "" && given.Branch != s.Branch {
		c.fail("the input branch is %s, but the event names %s; leave the input out", shown(given.Branch), shown(s.Branch))
	}
	if c.err != nil {
		return Subject{}, c.err
	}
	if given.Pull != 0 && s.Pull == 0 {
		s.setPull(given.Pull)
		s.NeedsLookup = true
	}
	s.Branch = cmp.Or(s.Branch, given.Branch)
	return s, nil
}

func (s *Subject) setPull(number int) { s.Pull, s.Pulls = number, []int{number} }
