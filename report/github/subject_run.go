package github

import (
	"cmp"
	"errors"
	"regexp"
	"slices"
	"strconv"
)

// readRun reads the event of a workflow that reports the run of another one.
// The kind of the run decides, never its branch: a fork's branch may be called
// main too.
func readRun(env Environment, s *Subject) error {
	p, err := decode[runPayload](env.Payload)
	if err != nil {
		return err
	}
	if p.Run == nil {
		return errors.New("workflow_run is missing")
	}
	p.Repository.FullName = cmp.Or(p.Repository.FullName, env.Repository)
	var c checker
	s.Cause = p.Run.Event
	s.Head = c.commit("workflow_run.head_sha", p.Run.HeadSHA)
	s.Fork = !p.Run.HeadRepository.is(&p.Repository)
	switch {
	case s.ofPull():
		c.pullRun(s, p)
	case s.Fork:
		c.fail("workflow_run.head_repository is not this repository, although the run was for a %s", shown(s.Cause))
	case s.Cause == eventGroup:
		c.groupRun(s, p.Run.HeadBranch)
	case s.Cause == eventPush || dispatched(s.Cause):
		s.Branch = c.branch("workflow_run.head_branch", p.Run.HeadBranch)
		// The name of a tag stands in the same key, without a sign that it is one.
		s.NeedsLookup = s.Branch != s.DefaultBranch
	default:
		c.fail("workflow_run.event is %s; a run for that cannot be judged", shown(s.Cause))
	}
	return c.err
}

// ofPull says whether the judged run was for a pull request.
func (s Subject) ofPull() bool { return s.Cause == eventPull || s.Cause == eventTarget }

// pullRun takes the one open pull request that the event lists with the run's
// own head. The list is empty for forks, may hold pull requests to other
// repositories, and shows heads as they are now, not as they were for the run.
func (c *checker) pullRun(s *Subject, p runPayload) {
	run := p.Run
	s.HeadOwner = run.HeadRepository.owner()
	if run.HeadBranch != "" {
		s.HeadBranch = c.branch("workflow_run.head_branch", run.HeadBranch)
	}
	fits := slices.DeleteFunc(slices.Clone(run.Pulls), func(k pullKeys) bool {
		return k.Head.SHA != run.HeadSHA || k.Head.Ref != run.HeadBranch ||
			!sameID(k.Head.Repo, run.HeadRepository) || !sameID(k.Base.Repo, &p.Repository)
	})
	if len(fits) != 1 {
		s.NeedsLookup = true
		return
	}
	// Repositories in the list have no full name: whether it is a fork, and
	// whose, is known from the run.
	known := *s
	c.pull(s, fits[0])
	s.Fork, s.HeadOwner = known.Fork, known.HeadOwner
}

// sameID compares repositories of which one is listed without its name.
func sameID(a, b *repositoryKeys) bool {
	return a != nil && b != nil && a.ID != 0 && a.ID == b.ID
}

func (c *checker) groupRun(s *Subject, headBranch string) {
	s.HeadBranch = c.branch("workflow_run.head_branch", headBranch)
	branch, pull := queued(s.HeadBranch)
	if pull == 0 {
		c.fail("workflow_run.head_branch is %s, not the branch of a merge group", shown(headBranch))
		return
	}
	s.Branch = c.branch("workflow_run.head_branch", branch)
	s.setPull(pull)
}

// queueBranch wants the pull request at the very end: the target branch may look
// like one of a queue itself.
var queueBranch = regexp.MustCompile(`^gh-readonly-queue/(.+)/pr-([1-9][0-9]{0,8})-(?:[0-9a-f]{40}|[0-9a-f]{64})$`)

// queued reads the target and the pull request from the name of a merge group's
// branch, which only the host can make; 0 if it is none.
func queued(name string) (branch string, pull int) {
	found := queueBranch.FindStringSubmatch(name)
	if found == nil {
		return "", 0
	}
	pull, _ = strconv.Atoi(found[2]) // at most nine digits
	return found[1], pull
}
