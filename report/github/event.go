package github

import (
	"cmp"
	"errors"
	"fmt"
	"maps"
	"slices"
	"strings"
)

// Environment is what the runner tells of the event.
type Environment struct {
	Event      string // GITHUB_EVENT_NAME
	Payload    []byte // content of the file GITHUB_EVENT_PATH
	Repository string // GITHUB_REPOSITORY, "owner/name"
	SHA        string // GITHUB_SHA
	Ref        string // GITHUB_REF, "refs/heads/main"
}

// Events that are treated apart.
const (
	eventPull     = "pull_request"
	eventTarget   = "pull_request_target"
	eventPush     = "push"
	eventSchedule = "schedule"
	eventManual   = "workflow_dispatch"
	eventRemote   = "repository_dispatch"
	eventGroup    = "merge_group"
	eventRun      = "workflow_run"
)

// maxPayload is the most that hosts send.
const maxPayload = 25 << 20

var readers = map[string]func(Environment, *Subject) error{
	eventPull:     readPull,
	eventTarget:   readPull,
	eventPush:     readPush,
	eventSchedule: readDispatch,
	eventManual:   readDispatch,
	eventRemote:   readDispatch,
	eventGroup:    readGroup,
	eventRun:      readRun,
}

// dispatched says whether an event is for whatever a branch points to, and not
// for one change.
func dispatched(event string) bool {
	return event == eventSchedule || event == eventManual || event == eventRemote
}

// ReadEvent derives from an event what is to be judged. It asks nobody: where
// the event does not say all, the subject needs a lookup.
func ReadEvent(env Environment) (Subject, error) {
	read := readers[env.Event]
	if read == nil {
		known := strings.Join(slices.Sorted(maps.Keys(readers)), ", ")
		return Subject{}, fmt.Errorf("the event %s cannot be judged; start the workflow on one of %s", shown(env.Event), known)
	}
	if len(env.Payload) > maxPayload {
		return Subject{}, fmt.Errorf("the payload of the event is %d bytes; hosts send at most %d", len(env.Payload), maxPayload)
	}
	s := Subject{Event: env.Event, Cause: env.Event}
	err := s.readHome(env)
	if err == nil {
		err = read(env, &s)
	}
	if err != nil {
		return Subject{}, fmt.Errorf("event %s: %w", env.Event, err)
	}
	return s, nil
}

// readHome reads what all events have.
func (s *Subject) readHome(env Environment) error {
	p, err := decode[homePayload](env.Payload)
	if err != nil || p.Repository.DefaultBranch == "" {
		return err
	}
	var c checker
	s.DefaultBranch = c.branch("repository.default_branch", p.Repository.DefaultBranch)
	return c.err
}

// readPull does not look at GITHUB_SHA: there it is the test merge, or the
// target's tip.
func readPull(env Environment, s *Subject) error {
	p, err := decode[pullPayload](env.Payload)
	if err != nil {
		return err
	}
	if p.Pull == nil {
		return errors.New("pull_request is missing")
	}
	p.Pull.Number = cmp.Or(p.Pull.Number, p.Number)
	var c checker
	c.pull(s, *p.Pull)
	return c.err
}

// pull fills in what the event or the API says of a pull request.
func (c *checker) pull(s *Subject, p pullKeys) {
	s.setPull(p.Number)
	if p.Number < 1 {
		c.fail("pull_request.number is %d, not the number of a pull request (1 or more)", p.Number)
	}
	s.Branch = c.branch("pull_request.base.ref", p.Base.Ref)
	s.Base = c.base("pull_request.base.sha", p.Base.SHA)
	s.Head = c.commit("pull_request.head.sha", p.Head.SHA)
	s.HeadBranch = c.branch("pull_request.head.ref", p.Head.Ref)
	s.HeadOwner = p.Head.Repo.owner()
	s.Fork = !p.Head.Repo.is(p.Base.Repo)
}

func readPush(env Environment, s *Subject) error {
	p, err := decode[refPayload](env.Payload)
	if err != nil {
		return err
	}
	var c checker
	s.Branch, s.Tag = c.ref("ref", cmp.Or(p.Ref, env.Ref))
	switch {
	case p.Deleted || p.After != "" && isNone(p.After):
		c.fail("%s was deleted, there is nothing to judge", shown(cmp.Or(p.Ref, env.Ref)))
	case s.Tag != "":
		// Before and after may be ids of tag objects, which are no commits.
		s.Head = c.commit("head_commit.id", cmp.Or(p.HeadCommit.ID, env.SHA))
		c.tagged(s, p)
	default:
		s.Head = c.commit("after", cmp.Or(p.After, env.SHA))
		s.Base = c.base("before", p.Before)
	}
	return c.err
}

// tagged finds the branch of a tag.
func (c *checker) tagged(s *Subject, p refPayload) {
	if p.BaseRef != "" {
		s.Branch, _ = c.ref("base_ref", p.BaseRef)
	}
	s.Branch = cmp.Or(s.Branch, s.DefaultBranch)
	s.NeedsLookup = s.Branch == ""
}

// readDispatch believes the runner: it checked out GITHUB_SHA of GITHUB_REF,
// which for a schedule is the default branch. What a dispatch carries with it is
// not looked at; the action's inputs are for that.
func readDispatch(env Environment, s *Subject) error {
	p, err := decode[refPayload](env.Payload)
	if err != nil {
		return err
	}
	var c checker
	s.Head = c.commit("GITHUB_SHA", env.SHA)
	ref := cmp.Or(env.Ref, p.Ref)
	if ref == "" && s.DefaultBranch != "" {
		ref = "refs/heads/" + s.DefaultBranch
	}
	s.Branch, s.Tag = c.ref("GITHUB_REF", ref)
	if s.Tag != "" {
		c.tagged(s, p)
	}
	return c.err
}

func readGroup(env Environment, s *Subject) error {
	p, err := decode[groupPayload](env.Payload)
	if err != nil {
		return err
	}
	if p.Group == nil {
		return errors.New("merge_group is missing")
	}
	var c checker
	s.Head = c.commit("merge_group.head_sha", p.Group.HeadSHA)
	s.Base = c.base("merge_group.base_sha", p.Group.BaseSHA)
	s.Branch, _ = c.ref("merge_group.base_ref", p.Group.BaseRef)
	s.HeadBranch, _ = c.ref("merge_group.head_ref", p.Group.HeadRef)
	if branch, pull := queued(s.HeadBranch); pull != 0 && branch == s.Branch {
		s.setPull(pull)
	}
	return c.err
}
