package main

import (
	"encoding/json"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/report/github/apitest"
)

// workspaces are the kinds of clone that a job may have of a pull request.
var workspaces = map[string]func(*world) string{
	"no clone":       func(w *world) string { return "" },
	"a full clone":   func(w *world) string { return w.clone("topic") },
	"a shallow one":  func(w *world) string { return w.clone("topic", "--depth", "1") },
	"the other side": func(w *world) string { return w.clone("main", "--depth", "1") },
}

func TestPullRequest(t *testing.T) {
	for name, workspace := range workspaces {
		t.Run(name, func(t *testing.T) {
			w := newWorld(t, nil)
			s := w.pull(lean(t, w.head))
			s.dir = workspace(w)
			o := w.run(s)
			require.Equal(t, exitDone, o.status, "%s%s", o.log, o.complaint)
			assert.Equal(t, map[string]string{"gate": "open", "total-g": "100", "held-ratio": "",
				"statement-md": filepath.Join("budgetcheck-statement", "statement.md"), "statement-json": filepath.Join("budgetcheck-statement", "statement.json")}, o.outputs)
			assert.True(t, strings.HasPrefix(o.summary, o.statement), "the summary is the statement")
			require.Len(t, w.api.Comments(7), 1)
			assert.Contains(t, w.api.Comments(7)[0].Body, o.statement)
			require.Len(t, w.api.CheckRuns(), 1)
			c := w.api.CheckRuns()[0]
			assert.Equal(t, []string{"budgetcheck", w.head, "completed", "success"}, []string{c.Name, c.HeadSHA, c.Status, c.Conclusion})
			assert.Empty(t, c.Annotations)
		})
	}
}

// The second run of a pull request edits what the first one posted, also when
// the verdict changes, and a check gets annotations on the policy's lines in
// the head commit.
func TestPullRequestTwice(t *testing.T) {
	w := newWorld(t, map[string]string{policyName: "# A line more.\n" + targetPolicy})
	require.Equal(t, exitDone, w.run(w.pull(lean(t, w.head))).status)
	first := w.api.Comments(7)[0]
	o := w.run(w.pull(heavy(t, w.head)))
	require.Equal(t, exitFinding, o.status)
	assert.Equal(t, "closed", o.outputs["gate"])
	require.Len(t, w.api.Comments(7), 1)
	second := w.api.Comments(7)[0]
	assert.Equal(t, first.ID, second.ID)
	assert.NotEqual(t, first.Body, second.Body)
	require.Len(t, w.api.CheckRuns(), 1)
	c := w.api.CheckRuns()[0]
	assert.Equal(t, "failure", c.Conclusion)
	assert.Contains(t, c.Title, "one training is over by 50.0 g")
	require.Len(t, c.Annotations, 1)
	a := c.Annotations[0]
	line := 2 + strings.Count(before(targetPolicy, "[[budget]]"), "\n")
	assert.Equal(t, []any{policyName, line, "failure", "one training, job retrain-tide"}, []any{a.Path, a.Line, a.Level, a.Title})
	assert.Contains(t, o.log, "::error file=budgetcheck.toml,line="+jsonText(t, line))
}

func before(text, words string) string {
	head, _, _ := strings.Cut(text, words)
	return head
}

func jsonText(t *testing.T, v any) string {
	t.Helper()
	b, err := json.Marshal(v)
	require.NoError(t, err)
	return string(b)
}

// A pull request of a fork has a token that only reads: nothing is posted,
// that is said, and the exit status is that of the ruling.
func TestPullRequestOfAFork(t *testing.T) {
	for want, records := range map[int]func(*testing.T, string) map[string]string{exitDone: lean, exitFinding: heavy} {
		w := newWorld(t, nil)
		s := w.pull(records(t, w.head))
		s.payload = w.pullEvent(fork)
		o := w.run(s)
		assert.Equal(t, want, o.status)
		assert.Contains(t, o.log, "The pull request comes from a fork, whose token only reads. The workflow_run after it posts.")
		assert.NotContains(t, o.log, "::warning", "that is as it should be")
		assert.Contains(t, o.summary, "one training")
		assert.Empty(t, w.api.Comments(7))
		assert.Empty(t, w.api.CheckRuns())
		assert.Empty(t, w.api.Statuses())
	}
}

// An ordinary pull request from a shallow clone of its head costs at most 8
// calls. Each further commit that the clone does not have is one more: the merge
// base where the target has moved on, and the head in a clone of the test merge.
func TestCallsOfAPullRequest(t *testing.T) {
	for name, c := range map[string]struct {
		moved bool
		clone string
		most  int
	}{
		"target as it was":                 {false, "topic", 8},
		"target moved on":                  {true, "topic", 9},
		"target as it was, the test merge": {false, "merged", 9},
	} {
		t.Run(name, func(t *testing.T) {
			w := newWorld(t, nil)
			w.repo.Branch("merged", w.base)
			w.repo.Merge("topic")
			if c.moved {
				w.repo.Checkout("main")
				w.repo.Commit("another", map[string]string{"docs/tides.md": "Tides and streams.\n"})
			}
			s := w.pull(heavy(t, w.head))
			s.dir = w.clone(c.clone, "--depth", "1")
			require.Equal(t, exitFinding, w.run(s).status)
			calls := names(w.api.Calls())
			assert.LessOrEqual(t, len(calls), c.most, "%v", calls)
			assert.Len(t, slices.Compact(slices.Sorted(slices.Values(calls))), len(calls)-1, "nothing is asked twice but the comments, after one was made: %v", calls)
			require.Equal(t, exitFinding, w.run(s).status)
			assert.LessOrEqual(t, len(w.api.Calls())-len(calls), c.most-2, "then it edits")
		})
	}
}

func names(calls []apitest.Call) (list []string) {
	for _, c := range calls {
		list = append(list, c.Method+" "+c.Path)
	}
	return list
}
