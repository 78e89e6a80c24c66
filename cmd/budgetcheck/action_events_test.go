package main

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/report/github/apitest"
)

// event is a step on an event of main's tip.
func (w *world) event(name string, payload map[string]any, records map[string]string) step {
	if payload == nil {
		payload = map[string]any{}
	}
	payload["repository"] = repository(home)
	return step{event: name, payload: payload, sha: w.base, ref: "refs/heads/main", records: records}
}

// pushed merges topic and tells of the push.
func (w *world) pushed(records func(*testing.T, string) map[string]string) (s step, tip string) {
	w.repo.Checkout("main")
	tip = w.repo.Merge("topic")
	s = w.event("push", map[string]any{"ref": "refs/heads/main", "before": w.base, "after": tip}, records(w.t, w.head))
	s.sha = tip
	return s, tip
}

// A push is judged by the policy that was pushed with it. The run of the pull
// request stands for the merge commit, whose inputs are the same.
func TestPush(t *testing.T) {
	for want, records := range map[int]func(*testing.T, string) map[string]string{exitDone: lean, exitFinding: heavy} {
		w := newWorld(t, nil)
		s, tip := w.pushed(records)
		o := w.run(s)
		require.Equal(t, want, o.status, "%s%s", o.log, o.complaint)
		assert.NotContains(t, o.statement, "run it again")
		assert.Empty(t, w.api.Comments(7), "there is no pull request to comment on")
		require.Len(t, w.api.CheckRuns(), 1)
		assert.Equal(t, tip, w.api.CheckRuns()[0].HeadSHA)
	}
}

// Documentation that is pushed needs no run.
func TestPushOfDocumentation(t *testing.T) {
	w := newWorld(t, nil)
	w.repo.Checkout("main")
	tip := w.repo.Commit("words", map[string]string{"docs/tides.md": "Tides and streams.\n"})
	s := w.event("push", map[string]any{"ref": "refs/heads/main", "before": w.base, "after": tip}, nil)
	s.sha = tip
	o := w.run(s)
	assert.Equal(t, exitDone, o.status, o.log)
	assert.Contains(t, o.statement, "inputs unchanged")
	// A new branch has no commit before it: everything is asked for.
	s.payload["before"] = "0000000000000000000000000000000000000000"
	assert.Equal(t, exitFinding, w.run(s).status)
}

// A forced push may leave a commit that no clone has any more.
func TestPushFromAnUnknownCommit(t *testing.T) {
	w := newWorld(t, nil)
	s, _ := w.pushed(lean)
	s.payload["before"] = "00000000000000000000000000000000000000aa"
	o := w.run(s)
	assert.Equal(t, exitDone, o.status, o.log)
	assert.Contains(t, o.statement, "where the push left the branch is not known: every job is asked for a run")
}

func TestSchedule(t *testing.T) {
	for want, records := range map[int]func(*testing.T, string) map[string]string{exitDone: lean, exitFinding: heavy} {
		w := newWorld(t, nil)
		o := w.run(w.event("schedule", map[string]any{"schedule": "15 2 * * *"}, records(t, w.base)))
		require.Equal(t, want, o.status, "%s%s", o.log, o.complaint)
		require.Len(t, w.api.CheckRuns(), 1)
		assert.Equal(t, w.base, w.api.CheckRuns()[0].HeadSHA)
	}
	// A night without a record is no night without emissions.
	w := newWorld(t, nil)
	o := w.run(w.event("schedule", nil, nil))
	assert.Equal(t, exitFinding, o.status)
	assert.Contains(t, o.statement, "job retrain-tide is required, and there is no head run of it")
}

// Runs that were dispatched from a cluster name the pull request.
func TestDispatchForAPullRequest(t *testing.T) {
	for _, event := range []string{"workflow_dispatch", "repository_dispatch"} {
		w := newWorld(t, nil)
		s := w.event(event, map[string]any{"client_payload": map[string]any{"pull": 999}, "inputs": map[string]any{"pull": "998"}}, lean(t, w.head))
		s.inputs = map[string]string{"pull": "7", "commit": map[string]string{"repository_dispatch": w.head}[event]}
		o := w.run(s)
		require.Equal(t, exitDone, o.status, "%s%s", o.log, o.complaint)
		assert.Len(t, w.api.Comments(7), 1)
		require.Len(t, w.api.CheckRuns(), 1)
		assert.Equal(t, w.head, w.api.CheckRuns()[0].HeadSHA)
	}
}

// A run that comes late, for a commit that the pull request has left behind,
// gets its check there and leaves the comment to the newest commit.
func TestLateDispatch(t *testing.T) {
	w := newWorld(t, nil)
	s := w.event("repository_dispatch", nil, lean(t, w.base))
	s.inputs = map[string]string{"pull": "7", "commit": w.base}
	w.run(s)
	assert.Empty(t, w.api.Comments(7))
	require.Len(t, w.api.CheckRuns(), 1)
	assert.Equal(t, w.base, w.api.CheckRuns()[0].HeadSHA)
}

func TestDispatchForABranchAndACommit(t *testing.T) {
	w := newWorld(t, nil)
	s := w.event("workflow_dispatch", nil, lean(t, w.head))
	s.inputs = map[string]string{"branch": "topic", "commit": w.head}
	o := w.run(s)
	require.Equal(t, exitDone, o.status, "%s%s", o.log, o.complaint)
	assert.Contains(t, o.statement, "topic")
	assert.Equal(t, w.head, w.api.CheckRuns()[0].HeadSHA)
	// A branch alone means its tip.
	s.inputs = map[string]string{"branch": "topic"}
	require.Equal(t, exitDone, w.run(s).status)
	assert.Equal(t, w.head, w.api.CheckRuns()[0].HeadSHA)
	// What is no commit is not guessed at, and nothing is posted for it.
	s.inputs = map[string]string{"commit": "topic"}
	o = w.run(s)
	assert.Equal(t, exitCannot, o.status)
	assert.Contains(t, o.complaint, "the input commit is")
	assert.Equal(t, "unknown", o.outputs["gate"])
	assert.Len(t, w.api.CheckRuns(), 1)
}

// A merge queue is judged on its own commit by the policy of the queue's base.
func TestMergeGroup(t *testing.T) {
	for want, records := range map[int]func(*testing.T, string) map[string]string{exitDone: lean, exitFinding: heavy} {
		w := newWorld(t, map[string]string{policyName: strings.Replace(targetPolicy, "150 g", "900 g", 1)})
		queue := "gh-readonly-queue/main/pr-7-" + w.base
		w.repo.Branch(queue, w.base)
		group := w.repo.Merge("topic")
		s := w.event("merge_group", map[string]any{"action": "checks_requested", "merge_group": map[string]any{
			"head_sha": group, "head_ref": "refs/heads/" + queue, "base_sha": w.base, "base_ref": "refs/heads/main"}}, records(t, w.head))
		s.sha, s.ref = group, "refs/heads/"+queue
		o := w.run(s)
		require.Equal(t, want, o.status, "%s%s", o.log, o.complaint)
		require.Len(t, w.api.CheckRuns(), 1)
		assert.Equal(t, group, w.api.CheckRuns()[0].HeadSHA)
		assert.Empty(t, w.api.Comments(7), "the group's statement does not take the place of the pull request's")
	}
}

func TestTagPush(t *testing.T) {
	w := newWorld(t, nil)
	w.repo.Git("tag", "v1.0.0", w.base)
	s := w.event("push", map[string]any{"ref": "refs/tags/v1.0.0", "before": strings.Repeat("0", 40), "after": w.base,
		"base_ref": "refs/heads/main", "head_commit": map[string]any{"id": w.base}}, heavy(t, w.base))
	s.ref = "refs/tags/v1.0.0"
	o := w.run(s)
	require.Equal(t, exitFinding, o.status, "%s%s", o.log, o.complaint)
	assert.Contains(t, o.statement, "one training", "the budgets of the branch that it is on")
	assert.Equal(t, w.base, w.api.CheckRuns()[0].HeadSHA)
}

// What nobody can judge is exit status 2, whatever is enforced.
func TestEventThatCannotBeJudged(t *testing.T) {
	w := newWorld(t, nil)
	s := w.event("issues", nil, nil)
	s.inputs = map[string]string{"enforce": "false"}
	o := w.run(s)
	assert.Equal(t, exitCannot, o.status)
	assert.Contains(t, o.complaint, `the event "issues" cannot be judged`)
	assert.Equal(t, "unknown", o.outputs["gate"])
	assert.Contains(t, o.summary, "cannot be judged")
	assert.Equal(t, []apitest.CheckRun(nil), w.api.CheckRuns())
}
