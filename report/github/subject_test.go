package github

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// Subjects as ReadEvent makes them.
var (
	ofDispatch = Subject{Event: "repository_dispatch", Cause: "repository_dispatch", Branch: "main", Head: mergeSHA, DefaultBranch: "main"}
	ofPush     = Subject{Event: "push", Cause: "push", Branch: "main", Head: headSHA, Base: baseSHA, DefaultBranch: "main"}
	ofTag      = Subject{Event: "push", Cause: "push", Branch: "main", Tag: "v1", Head: headSHA, DefaultBranch: "main"}
	ofLoneTag  = Subject{Event: "push", Cause: "push", Tag: "v1", Head: headSHA, NeedsLookup: true}
	ofPull     = Subject{Event: "pull_request", Cause: "pull_request", Branch: "main", Pull: 214, Pulls: []int{214}, Head: headSHA, Base: baseSHA,
		Fork: true, HeadBranch: "main", HeadOwner: "spring-tide", DefaultBranch: "main"}
)

func TestWith(t *testing.T) {
	for _, c := range []struct {
		what                 string
		event                Subject
		branch, pull, commit string
		want                 Subject
	}{
		{"nothing given", ofPull, "", "", "", ofPull},
		{"what the event says", ofPull, "main", "214", headSHA, ofPull},
		{"nothing given for a tag that needs a lookup", ofLoneTag, "", "", "", ofLoneTag},

		// A dispatch stands on the default branch, which is not what it is about.
		{"a run on a pull request", ofDispatch, "", "214", "", Subject{Pull: 214, Pulls: []int{214}, NeedsLookup: true}},
		{"with its commit", ofDispatch, "", "214", headSHA, Subject{Pull: 214, Pulls: []int{214}, Head: headSHA, NeedsLookup: true}},
		{"with its target", ofDispatch, "release", "214", "", Subject{Pull: 214, Pulls: []int{214}, Branch: "release", NeedsLookup: true}},
		{"with both", ofDispatch, "release", " 0214\n", headSHA, Subject{Pull: 214, Pulls: []int{214}, Branch: "release", Head: headSHA}},
		{"with both, which the event says too", ofDispatch, "main", "214", mergeSHA, Subject{Pull: 214, Pulls: []int{214}, Branch: "main", Head: mergeSHA}},
		{"a run on a branch", ofDispatch, "storm", "", "", Subject{Branch: "storm", NeedsLookup: true}},
		{"at a commit", ofDispatch, "storm", "", headSHA, Subject{Branch: "storm", Head: headSHA}},
		{"at the event's commit", ofDispatch, "storm", "", mergeSHA, Subject{Branch: "storm", Head: mergeSHA}},
		{"on the event's branch", ofDispatch, "main", "", "", ofDispatch},
		{"a commit alone", ofDispatch, "", "", headSHA, Subject{Branch: "main", Head: headSHA}},

		// A push is about its own commit.
		{"rules of another branch", ofPush, "release", "", "", Subject{Branch: "release", Head: headSHA, Base: baseSHA}},
		{"another commit", ofPush, "", "", mergeSHA, Subject{Branch: "main", Head: mergeSHA}},
		{"a pull request", ofPush, "", "214", "", Subject{Pull: 214, Pulls: []int{214}, NeedsLookup: true}},
		{"the branch of a tag", ofTag, "release", "", "", Subject{Branch: "release", Tag: "v1", Head: headSHA}},
		{"the branch of a tag that has none", ofLoneTag, "release", "", "", Subject{Branch: "release", Tag: "v1", Head: headSHA}},
	} {
		got, err := c.event.With(c.branch, c.pull, c.commit)
		require.NoError(t, err, c.what)
		c.want.Event, c.want.Cause, c.want.DefaultBranch = c.event.Event, c.event.Cause, c.event.DefaultBranch
		assert.Equal(t, c.want, got, c.what)
	}
}

func TestWithOnAPullRequest(t *testing.T) {
	got, err := ofPull.With("release", "214", mergeSHA)
	require.NoError(t, err)
	want := ofPull
	want.Branch, want.Base, want.Head = "release", "", mergeSHA
	assert.Equal(t, want, got)

	got, err = ofPull.With("", "", mergeSHA)
	require.NoError(t, err)
	assert.Equal(t, baseSHA, got.Base, "the target did not move")

	got, err = ofPull.With("", "7", "")
	require.NoError(t, err)
	assert.Equal(t, Subject{Event: "pull_request", Cause: "pull_request", Pull: 7, Pulls: []int{7}, DefaultBranch: "main", NeedsLookup: true}, got)
}

// A dispatched tag keeps its commit: it is not the tip of any branch.
func TestWithOnADispatchedTag(t *testing.T) {
	s := ofDispatch
	s.Tag = "v1"
	got, err := s.With("release", "", "")
	require.NoError(t, err)
	assert.Equal(t, mergeSHA, got.Head)
	assert.False(t, got.NeedsLookup)
}

func TestWithRefuses(t *testing.T) {
	for _, c := range []struct{ branch, pull, commit, says string }{
		{" ", "", "", "the input branch is missing"},
		{"a b", "", "", `the input branch is "a b", not the name of a branch or tag: git does not allow its characters`},
		{"x\x1b[2J", "", "", `the input branch is "x\x1b[2J", not the name of a branch or tag: it has control characters`},
		{"", "0", "", `the input pull is "0", not the number of a pull request (1 or more)`},
		{"", "-1", "", `the input pull is "-1", not the number of a pull request (1 or more)`},
		{"", "+1", "", `the input pull is "+1", not the number of a pull request (1 or more)`},
		{"", "1.0", "", `the input pull is "1.0", not the number of a pull request (1 or more)`},
		{"", "#214", "", `the input pull is "#214", not the number of a pull request (1 or more)`},
		{"", "2147483648", "", `the input pull is "2147483648", not the number of a pull request (1 or more)`},
		{"", "\t", "", `the input pull is "", not the number of a pull request (1 or more)`},
		{"", "", "HEAD", `the input commit is "HEAD", not the full id of a commit (40 or 64 hexadecimal digits)`},
		{"", "", "a1b2c3d", `the input commit is "a1b2c3d", not the full id of a commit (40 or 64 hexadecimal digits)`},
		{"", "", "\n", "the input commit is missing"},
	} {
		for _, event := range []Subject{ofDispatch, ofPush, ofPull, {Event: "workflow_run", Cause: "push", Branch: "main", Head: headSHA}} {
			got, err := event.With(c.branch, c.pull, c.commit)
			require.EqualError(t, err, c.says)
			assert.Equal(t, Subject{}, got)
		}
	}
}

// What a workflow_run reports may have written the inputs of the workflow.
func TestWithOnAWorkflowRun(t *testing.T) {
	known := Subject{Event: "workflow_run", Cause: "pull_request", Branch: "main", Pull: 215, Pulls: []int{215}, Head: headSHA, Base: baseSHA}
	open := Subject{Event: "workflow_run", Cause: "pull_request", Head: headSHA, Fork: true, NeedsLookup: true}
	withPull, withBranch := open, open
	withPull.Pull, withPull.Pulls = 214, []int{214}
	withBranch.Branch = "release"
	for _, c := range []struct {
		what                 string
		event                Subject
		branch, pull, commit string
		want                 Subject
		says                 string
	}{
		{"nothing", known, "", "", "", known, ""},
		{"the same", known, "main", "215", headSHA, known, ""},
		{"another commit", known, "", "", mergeSHA, Subject{},
			"the input commit is " + mergeSHA + ", but the run that this workflow_run reports was for " + headSHA + "; leave the input out"},
		{"another pull request", known, "", "214", "", Subject{}, "the input pull is 214, but the event names pull request 215; leave the input out"},
		{"another branch", known, "lax", "", "", Subject{}, `the input branch is "lax", but the event names "main"; leave the input out`},
		{"another commit of an open one", open, "", "214", mergeSHA, Subject{},
			"the input commit is " + mergeSHA + ", but the run that this workflow_run reports was for " + headSHA + "; leave the input out"},
		{"the pull request of an open one", open, "", "214", "", withPull, ""},
		{"the target of an open one", open, "release", "", headSHA, withBranch, ""},
	} {
		got, err := c.event.With(c.branch, c.pull, c.commit)
		if c.says != "" {
			require.EqualError(t, err, c.says, c.what)
			assert.Equal(t, Subject{}, got, c.what)
			continue
		}
		require.NoError(t, err, c.what)
		assert.Equal(t, c.want, got, c.what)
	}
}

// With both given, a pull request of a workflow_run is looked up all the same.
func TestWithOnAWorkflowRunAlwaysLooksUp(t *testing.T) {
	s := Subject{Event: "workflow_run", Cause: "push", Branch: "main", Head: headSHA}
	got, err := s.With("main", "214", headSHA)
	require.NoError(t, err)
	assert.True(t, got.NeedsLookup)
}

// One comment on a pull request, about its newest commit.
func TestCommentOn(t *testing.T) {
	stale, group := ofPull, ofPull
	stale.Stale = true
	group.Event, group.Cause = "workflow_run", "merge_group"
	assert.Equal(t, 214, ofPull.CommentOn())
	for _, s := range []Subject{stale, group, ofPush, ofTag} {
		assert.Zero(t, s.CommentOn(), "%+v", s)
	}
}

// A push to a topic branch has the same head as its pull request, and other
// rules: it must not take the place of the pull request's check.
func TestCalled(t *testing.T) {
	for want, s := range map[string]Subject{
		"budgetcheck":            {Cause: eventPull, Pull: 7, Branch: "main", DefaultBranch: "main"},
		"budgetcheck (topic)":    {Cause: eventPush, Branch: "topic", DefaultBranch: "main"},
		"gauges":                 {Cause: eventPush, Branch: "main", DefaultBranch: "main"},
		"gauges (harbour/works)": {Cause: eventManual, Branch: "harbour/works", DefaultBranch: "main"},
		"queue":                  {Cause: eventGroup, Branch: "works", DefaultBranch: "main"},
	} {
		name, _, _ := strings.Cut(want, " ")
		assert.Equal(t, want, s.Called(name))
	}
	assert.Equal(t, "budgetcheck (topic)", Subject{Cause: eventPush, Branch: "topic", DefaultBranch: "main"}.Called(""))
}
