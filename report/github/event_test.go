package github

import (
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// Commits of the payloads in testdata. octo* are those of published examples.
var (
	headSHA  = strings.Repeat("a1", 20)
	baseSHA  = strings.Repeat("b2", 20)
	mergeSHA = strings.Repeat("c3", 20) // the test merge, which is never judged
	queueSHA = strings.Repeat("d4", 20)

	octoHead = "ec26c3e57ca3a959ca5aad62de7213c562f8c821"
	octoBase = "f95f852bd8fca8fcc58a9a2d6c842781e32a215e"
	octoPush = "6113728f27ae82c7b1a177c8d03f9e96e0adf246"
)

func readPayload(t testing.TB, name string) []byte {
	t.Helper()
	payload, err := os.ReadFile(filepath.Join("testdata", "payloads", name+".json"))
	require.NoError(t, err)
	return payload
}

// environment is what a runner tells for a payload. Its commit is one that
// only events without a commit of their own may use.
func environment(t testing.TB, name string) Environment {
	t.Helper()
	event, _, _ := strings.Cut(name, ".")
	env := Environment{Event: event, Payload: readPayload(t, name), Repository: "harbour/tide-forecast", SHA: mergeSHA, Ref: "refs/heads/main"}
	if strings.HasPrefix(event, "pull_request") {
		env.Ref = "refs/pull/214/merge"
	}
	return env
}

// expected is what each payload asks to judge, by its file.
var expected = map[string]Subject{
	"pull_request.opened": {
		Branch: "master", Pull: 2, Pulls: []int{2}, Head: octoHead, Base: octoBase, HeadBranch: "changes", HeadOwner: "Codertocat", DefaultBranch: "master",
	},
	"pull_request.synchronize": {
		Branch: "master", Pull: 2, Pulls: []int{2}, Head: octoHead, Base: octoBase, HeadBranch: "changes", HeadOwner: "Codertocat", DefaultBranch: "master",
	},
	"pull_request.fork": {
		Branch: "main", Pull: 214, Pulls: []int{214}, Head: headSHA, Base: baseSHA, Fork: true, HeadBranch: "main", HeadOwner: "spring-tide", DefaultBranch: "main",
	},
	"push.branch-created":         {Branch: "master", Head: octoPush, DefaultBranch: "master"},
	"push.branch":                 {Branch: "release/2031.1", Head: headSHA, Base: baseSHA, DefaultBranch: "main"},
	"push.tag":                    {Branch: "master", Tag: "simple-tag", Head: octoPush, DefaultBranch: "master"},
	"push.annotated-tag":          {Branch: "release/2031.1", Tag: "v2031.1", Head: headSHA, DefaultBranch: "main"},
	"schedule.nightly":            {Branch: "main", Head: mergeSHA, DefaultBranch: "main"},
	"workflow_dispatch.example":   {Branch: "main", Head: mergeSHA, DefaultBranch: "main"},
	"repository_dispatch.example": {Branch: "main", Head: mergeSHA, DefaultBranch: "master"},
	// What a dispatch carries is whatever its sender wrote.
	"repository_dispatch.cluster": {Branch: "main", Head: mergeSHA, DefaultBranch: "main"},
	// In this example head_ref and base_sha are not of one queue: only names count.
	"merge_group.queued": {
		Branch: "main", Pull: 104, Pulls: []int{104}, Head: "2ffea6db159f6b6c47a24e778fb9ef40cf6b1c7d", Base: "380387fbc80638b734a49e1be1c4dfec1c01b33c",
		HeadBranch: "gh-readonly-queue/main/pr-104-929f8209d40f77f4abc622a499c93a83babdbe64", DefaultBranch: "main",
	},
	"merge_group.slash": {
		Branch: "release/2031.1", Pull: 214, Pulls: []int{214}, Head: queueSHA, Base: baseSHA,
		HeadBranch: "gh-readonly-queue/release/2031.1/pr-214-" + baseSHA, DefaultBranch: "main",
	},
	"workflow_run.pull_request": {
		Cause: "pull_request", Branch: "main", Pull: 215, Pulls: []int{215}, Head: headSHA, Base: baseSHA, HeadBranch: "longer-gauges", HeadOwner: "harbour", DefaultBranch: "main",
	},
	// The branch of a fork may be called main too: it must not get main's rules.
	"workflow_run.fork": {
		Cause: "pull_request", Head: headSHA, Fork: true, HeadBranch: "main", HeadOwner: "spring-tide", DefaultBranch: "main", NeedsLookup: true,
	},
	"workflow_run.push": {Cause: "push", Branch: "main", Head: headSHA, DefaultBranch: "main"},
	// The run was for no pull request, whatever the event lists.
	"workflow_run.repository_dispatch": {Cause: "repository_dispatch", Branch: "master", Head: "3484a3fb816e0859fd6e1cea078d76385ff50625", DefaultBranch: "master"},
	"workflow_run.merge_group": {
		Cause: "merge_group", Branch: "main", Pull: 214, Pulls: []int{214}, Head: queueSHA, HeadBranch: "gh-readonly-queue/main/pr-214-" + baseSHA, DefaultBranch: "main",
	},
}

func TestReadEvent(t *testing.T) {
	for name, want := range expected {
		t.Run(name, func(t *testing.T) {
			env := environment(t, name)
			want.Event = env.Event
			if want.Cause == "" {
				want.Cause = env.Event
			}
			got, err := ReadEvent(env)
			require.NoError(t, err)
			assert.Equal(t, want, got)
		})
	}
}

// A payload that no test reads would prove nothing.
func TestEveryPayloadIsRead(t *testing.T) {
	files, err := filepath.Glob(filepath.Join("testdata", "payloads", "*.json"))
	require.NoError(t, err)
	elsewhere := map[string]bool{"push.tag-deleted": true}
	for _, f := range files {
		name := strings.TrimSuffix(filepath.Base(f), ".json")
		_, read := expected[name]
		assert.True(t, read != elsewhere[name], name)
	}
	assert.Len(t, files, len(expected)+len(elsewhere))
}

func TestPullRequestTargetIsReadAlike(t *testing.T) {
	env := environment(t, "pull_request.fork")
	one, err := ReadEvent(env)
	require.NoError(t, err)
	env.Event = "pull_request_target"
	other, err := ReadEvent(env)
	require.NoError(t, err)
	assert.Equal(t, "pull_request_target", other.Cause)
	one.Event, one.Cause = other.Event, other.Cause
	assert.Equal(t, one, other)
}

// A fork's own workflow may write nothing, the workflow after it may.
func TestMayWrite(t *testing.T) {
	for event, may := range map[string]bool{"pull_request": false, "pull_request_target": true, "workflow_run": true} {
		assert.Equal(t, may, Subject{Event: event, Fork: true}.MayWrite(), event)
		assert.True(t, Subject{Event: event}.MayWrite(), event)
	}
}

func TestDeletedTagIsNothingToJudge(t *testing.T) {
	_, err := ReadEvent(environment(t, "push.tag-deleted"))
	require.EqualError(t, err, `event push: "refs/tags/simple-tag" was deleted, there is nothing to judge`)
}

// changed is a payload in which the values at some paths are others; nil takes
// the key away.
func changed(t testing.TB, name string, values map[string]any) []byte {
	t.Helper()
	var whole map[string]any
	require.NoError(t, json.Unmarshal(readPayload(t, name), &whole))
	for path, value := range values {
		at, keys := whole, strings.Split(path, ".")
		for _, key := range keys[:len(keys)-1] {
			require.IsType(t, at, at[key], path)
			at = at[key].(map[string]any)
		}
		last := keys[len(keys)-1]
		if at[last] = value; value == nil {
			delete(at, last)
		}
	}
	payload, err := json.Marshal(whole)
	require.NoError(t, err)
	return payload
}

// readChanged reads a payload with other values.
func readChanged(t testing.TB, name string, values map[string]any) (Subject, error) {
	t.Helper()
	env := environment(t, name)
	env.Payload = changed(t, name, values)
	return ReadEvent(env)
}

func TestForkIsTold(t *testing.T) {
	for _, c := range []struct {
		what   string
		values map[string]any
		fork   bool
		owner  string
	}{
		{"another owner's", map[string]any{}, true, "spring-tide"},
		{"same repository", map[string]any{"pull_request.head.repo.full_name": "harbour/tide-forecast"}, false, "harbour"},
		{"names differ in case only", map[string]any{"pull_request.head.repo.full_name": "Harbour/Tide-Forecast"}, false, "Harbour"},
		{"another of the same owner", map[string]any{"pull_request.head.repo.full_name": "harbour/tide-forecast-2"}, true, "harbour"},
		{"gone", map[string]any{"pull_request.head.repo": nil}, true, ""},
		{"without a name", map[string]any{"pull_request.head.repo.full_name": nil, "pull_request.base.repo.full_name": nil}, true, ""},
	} {
		s, err := readChanged(t, "pull_request.fork", c.values)
		require.NoError(t, err, c.what)
		assert.Equal(t, c.fork, s.Fork, c.what)
		assert.Equal(t, c.owner, s.HeadOwner, c.what)
		assert.Equal(t, !c.fork, s.MayWrite(), c.what)
	}
}

// Another make of host leaves out what stands elsewhere as well.
func TestEnvironmentStandsIn(t *testing.T) {
	for _, c := range []struct {
		name, ref string
		without   map[string]any
		want      Subject
	}{
		{"push.branch", "refs/heads/storm", map[string]any{"ref": nil, "after": nil}, Subject{Branch: "storm", Head: mergeSHA, Base: baseSHA}},
		{"push.tag", "refs/tags/simple-tag", map[string]any{"ref": nil, "head_commit": nil}, Subject{Branch: "master", Tag: "simple-tag", Head: mergeSHA}},
		{"schedule.nightly", "", map[string]any{}, Subject{Branch: "main", Head: mergeSHA}},
		{"workflow_dispatch.example", "", map[string]any{"ref": "refs/heads/storm"}, Subject{Branch: "storm", Head: mergeSHA}},
		{"pull_request.fork", "", map[string]any{"pull_request.number": nil, "pull_request.head.repo": nil}, Subject{
			Branch: "main", Pull: 214, Pulls: []int{214}, Head: headSHA, Base: baseSHA, Fork: true, HeadBranch: "main"}},
		{"workflow_dispatch.example", "refs/tags/v1", map[string]any{}, Subject{Branch: "main", Tag: "v1", Head: mergeSHA}},
		{"workflow_dispatch.example", "refs/tags/v1", map[string]any{"repository": nil}, Subject{Tag: "v1", Head: mergeSHA, NeedsLookup: true}},
		{"push.tag", "", map[string]any{"repository": nil}, Subject{Tag: "simple-tag", Head: octoPush, NeedsLookup: true}},
	} {
		env := environment(t, c.name)
		env.Ref, env.Payload = c.ref, changed(t, c.name, c.without)
		s, err := ReadEvent(env)
		require.NoError(t, err, c.name)
		c.want.Event, c.want.Cause, c.want.DefaultBranch = s.Event, s.Event, s.DefaultBranch
		assert.Equal(t, c.want, s, c.name)
	}
}
