package github

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// listed is an entry of the pull requests of a run, with the ids of the
// repositories of its head and base.
func listed(number int, ref, sha, base string, headRepo, baseRepo int) map[string]any {
	return map[string]any{
		"number": number,
		"head":   map[string]any{"ref": ref, "sha": sha, "repo": map[string]any{"id": headRepo}},
		"base":   map[string]any{"ref": base, "sha": baseSHA, "repo": map[string]any{"id": baseRepo}},
	}
}

// The repositories of the payloads.
const (
	homeID = 7001
	forkID = 7002
)

func TestPullOfARunIsTakenFromTheEventOnlyIfItIsTheOnlyOne(t *testing.T) {
	right := listed(215, "longer-gauges", headSHA, "main", homeID, homeID)
	for _, c := range []struct {
		what string
		list []any
		pull int
	}{
		{"none", []any{}, 0},
		{"one", []any{right}, 215},
		{"two targets", []any{right, listed(216, "longer-gauges", headSHA, "release/2031.1", homeID, homeID)}, 0},
		{"newer commits since", []any{listed(215, "longer-gauges", queueSHA, "main", homeID, homeID)}, 0},
		{"another branch at the same commit", []any{listed(217, "copy", headSHA, "main", homeID, homeID)}, 0},
		{"both of these", []any{listed(217, "copy", headSHA, "main", homeID, homeID), right}, 215},
		{"head in a fork", []any{listed(215, "longer-gauges", headSHA, "main", forkID, homeID)}, 0},
		{"to another repository", []any{listed(215, "longer-gauges", headSHA, "main", homeID, forkID)}, 0},
		{"repositories without ids", []any{listed(215, "longer-gauges", headSHA, "main", 0, 0)}, 0},
	} {
		s, err := readChanged(t, "workflow_run.pull_request", map[string]any{"workflow_run.pull_requests": c.list})
		require.NoError(t, err, c.what)
		assert.Equal(t, c.pull, s.Pull, c.what)
		assert.Equal(t, c.pull == 0, s.NeedsLookup, c.what)
		assert.Equal(t, c.pull != 0, s.Branch == "main", c.what)
		assert.Equal(t, headSHA, s.Head, c.what)
		assert.False(t, s.Fork, c.what)
		assert.Equal(t, "harbour", s.HeadOwner, c.what)
	}
}

func TestRunWithoutIDsAnywhereIsLookedUp(t *testing.T) {
	s, err := readChanged(t, "workflow_run.pull_request", map[string]any{
		"workflow_run.pull_requests": []any{listed(215, "longer-gauges", headSHA, "main", 0, 0)}, "repository.id": nil, "workflow_run.head_repository.id": nil,
	})
	require.NoError(t, err)
	assert.True(t, s.NeedsLookup)
}

func TestRunForAPullRequestTarget(t *testing.T) {
	for name, pull := range map[string]int{"workflow_run.pull_request": 215, "workflow_run.fork": 0} {
		s, err := readChanged(t, name, map[string]any{"workflow_run.event": "pull_request_target"})
		require.NoError(t, err, name)
		assert.Equal(t, "pull_request_target", s.Cause)
		assert.Equal(t, pull, s.Pull)
	}
}

func TestRunOfAForkThatIsGone(t *testing.T) {
	s, err := readChanged(t, "workflow_run.fork", map[string]any{"workflow_run.head_repository": nil, "workflow_run.head_branch": nil})
	require.NoError(t, err)
	assert.Equal(t, Subject{Event: "workflow_run", Cause: "pull_request", Head: headSHA, Fork: true, DefaultBranch: "main", NeedsLookup: true}, s)
}

// Without the name in the payload it is the environment's.
func TestRunKnowsItsRepository(t *testing.T) {
	s, err := readChanged(t, "workflow_run.push", map[string]any{"repository.full_name": nil})
	require.NoError(t, err)
	assert.False(t, s.Fork)
	env := environment(t, "workflow_run.push")
	env.Repository, env.Payload = "harbour/buoys", changed(t, "workflow_run.push", map[string]any{"repository.full_name": nil})
	_, err = ReadEvent(env)
	require.EqualError(t, err, `event workflow_run: workflow_run.head_repository is not this repository, although the run was for a "push"`)
}

func TestRunsForABranch(t *testing.T) {
	for _, cause := range []string{"push", "schedule", "workflow_dispatch", "repository_dispatch"} {
		s, err := readChanged(t, "workflow_run.push", map[string]any{"workflow_run.event": cause})
		require.NoError(t, err, cause)
		assert.Equal(t, Subject{Event: "workflow_run", Cause: cause, Branch: "main", Head: headSHA, DefaultBranch: "main"}, s, cause)
		s, err = readChanged(t, "workflow_run.push", map[string]any{"workflow_run.event": cause, "workflow_run.head_branch": "v2031.1"})
		require.NoError(t, err, cause)
		assert.True(t, s.NeedsLookup, "it may be a tag: %s", cause)
	}
}

func TestRunThatCannotBeJudged(t *testing.T) {
	for _, c := range []struct {
		name, key, value, says string
	}{
		{"workflow_run.push", "workflow_run.event", "issue_comment", `workflow_run.event is "issue_comment"; a run for that cannot be judged`},
		{"workflow_run.push", "workflow_run.event", "workflow_run", `workflow_run.event is "workflow_run"; a run for that cannot be judged`},
		{"workflow_run.fork", "workflow_run.event", "push", `workflow_run.head_repository is not this repository, although the run was for a "push"`},
		{"workflow_run.merge_group", "workflow_run.head_branch", "main", `workflow_run.head_branch is "main", not the branch of a merge group`},
	} {
		_, err := readChanged(t, c.name, map[string]any{c.key: c.value})
		require.EqualError(t, err, "event workflow_run: "+c.says)
	}
}

func TestQueued(t *testing.T) {
	sha64 := strings.Repeat("0a", 32)
	for _, c := range []struct {
		name, branch string
		pull         int
	}{
		{"gh-readonly-queue/main/pr-1-" + baseSHA, "main", 1},
		{"gh-readonly-queue/main/pr-999999999-" + sha64, "main", 999999999},
		{"gh-readonly-queue/release/2031/pr-7-" + baseSHA, "release/2031", 7},
		// A target branch may look like one of a queue itself.
		{"gh-readonly-queue/pr-5-" + baseSHA + "/pr-6-" + baseSHA, "pr-5-" + baseSHA, 6},
		{"gh-readonly-queue/main/pr-0-" + baseSHA, "", 0},
		{"gh-readonly-queue/main/pr-9999999999-" + baseSHA, "", 0},
		{"gh-readonly-queue/main/pr-1-" + baseSHA[1:], "", 0},
		{"gh-readonly-queue/main/pr-1-" + baseSHA + "/more", "", 0},
		{"gh-readonly-queue//pr-1-" + baseSHA, "", 0},
		{"x/gh-readonly-queue/main/pr-1-" + baseSHA, "", 0},
		{"", "", 0},
	} {
		branch, pull := queued(c.name)
		assert.Equal(t, c.branch, branch, c.name)
		assert.Equal(t, c.pull, pull, c.name)
	}
}

// Somebody may push a branch that looks like a queue's for another target.
func TestMergeGroupOfAnotherTargetNamesNoPull(t *testing.T) {
	s, err := readChanged(t, "merge_group.slash", map[string]any{"merge_group.base_ref": "refs/heads/main"})
	require.NoError(t, err)
	assert.Equal(t, "main", s.Branch)
	assert.Zero(t, s.Pull)
	assert.Nil(t, s.Pulls)
}
