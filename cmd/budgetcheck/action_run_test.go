package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/record"
	"budgetcheck/report/github/apitest"
)

// reported is the step in the second workflow: it comes from the default
// branch and has a clone of that.
func (w *world) reported(from string, records map[string]string) step {
	return step{event: "workflow_run", payload: w.runEvent(from), sha: w.base, ref: "refs/heads/main",
		dir: w.clone("main"), records: records}
}

func TestWorkflowRun(t *testing.T) {
	for want, records := range map[int]func(*testing.T, string) map[string]string{exitDone: lean, exitFinding: heavy} {
		w := newWorld(t, nil)
		o := w.run(w.reported(home, records(t, w.head)))
		require.Equal(t, want, o.status, "%s%s", o.log, o.complaint)
		assert.Len(t, w.api.Comments(7), 1)
		require.Len(t, w.api.CheckRuns(), 1)
		assert.Equal(t, w.head, w.api.CheckRuns()[0].HeadSHA)
	}
}

// forked is a pull request of a fork whose branch is called like ours.
func forked(t *testing.T) *world {
	w := newWorld(t, nil)
	w.options.Git = w.repo.Dir
	w.api = apitest.New(t, w.options)
	w.api.AddPull(apitest.Pull{Number: 3, Head: apitest.Branch{Ref: "other", SHA: w.base}, Base: apitest.Branch{Ref: "main", SHA: w.base}})
	w.api.AddPull(apitest.Pull{Number: 8, HeadOf: fork, Head: apitest.Branch{Ref: "topic", SHA: w.head}, Base: apitest.Branch{Ref: "main", SHA: w.base}})
	return w
}

// claiming is a record that says it belongs elsewhere.
func claiming(o *record.Open) { o.Pull, o.Branch = 3, "harbour-works" }

// Pull request, branch and commit come from event and API alone, whatever the
// records of a fork claim.
func TestWorkflowRunOfAFork(t *testing.T) {
	w := forked(t)
	o := w.run(w.reported(fork, map[string]string{"records/night.ndjson": training(t, "n1", w.head, 500, claiming)}))
	require.Equal(t, exitFinding, o.status, "%s%s", o.log, o.complaint)
	assert.Contains(t, o.statement, "one training", "the budgets of the target")
	assert.Empty(t, w.api.Comments(3))
	assert.Len(t, w.api.Comments(8), 1)
	require.Len(t, w.api.CheckRuns(), 1)
	assert.Equal(t, w.head, w.api.CheckRuns()[0].HeadSHA)
}

// A record of another commit proves nothing, also where the commit is real.
func TestWorkflowRunWithRecordsOfOtherCommits(t *testing.T) {
	for _, commit := range []string{"base", "00000000000000000000000000000000000000aa", "origin/topic", "--upload-pack=x", ""} {
		w := forked(t)
		if commit == "base" {
			commit = w.base
		}
		o := w.run(w.reported(fork, lean(t, commit)))
		assert.Equal(t, exitFinding, o.status, commit)
		assert.Contains(t, o.statement, "unproven")
		assert.Equal(t, "closed", o.outputs["gate"])
	}
}

// A link in an artifact could lead to any file of the machine: none is
// followed, neither as a file nor as a folder, and nothing of it is shown.
func TestWorkflowRunWithLinksInTheArtifact(t *testing.T) {
	for _, glob := range []string{"records/**/*.ndjson", "records/*/out/*.ndjson", "records/**", "records/b.ndjson", "records/{a,b}.ndjson"} {
		t.Run(glob, func(t *testing.T) {
			w := forked(t)
			s := w.reported(fork, nil)
			s.inputs = map[string]string{"head": glob}
			outside := t.TempDir()
			write(t, outside, map[string]string{"secret.ndjson": "the harbour's secret\n", "run.ndjson": training(t, "n2", w.head, 250)})
			records := filepath.Join(s.dir, "records")
			require.NoError(t, os.MkdirAll(filepath.Join(records, "deep"), 0o777))
			for name, to := range map[string]string{"a.ndjson": "secret.ndjson", "b.ndjson": "run.ndjson", "whole": "", "deep/out": ""} {
				require.NoError(t, os.Symlink(filepath.Join(outside, to), filepath.Join(records, filepath.FromSlash(name))))
			}
			o := w.run(s)
			assert.Equal(t, exitFinding, o.status)
			for _, shown := range []string{o.log, o.statement, o.summary, w.api.Comments(8)[0].Body} {
				assert.NotContains(t, shown, "the harbour's secret")
				assert.NotContains(t, shown, "`n2`")
			}
			assert.Contains(t, o.statement, "job retrain-tide is required, and there is no head run of it", "the run behind the link does not count")
		})
	}
}

// Names of files are the change's to choose as well.
func TestWorkflowRunWithNamesThatAreCommands(t *testing.T) {
	w := forked(t)
	o := w.run(w.reported(fork, map[string]string{"records/::set-output name=gate::open.ndjson": "::error::x\n", "records/a\n::stop-commands::x\n.ndjson": "{\n"}))
	assert.Equal(t, exitFinding, o.status)
	assert.Equal(t, "closed", o.outputs["gate"])
	for line := range strings.Lines(o.log + o.complaint) {
		command, _, ok := strings.Cut(strings.TrimPrefix(strings.TrimSpace(line), "::"), "::")
		name, _, _ := strings.Cut(command, " ")
		if ok && strings.HasPrefix(strings.TrimSpace(line), "::") {
			assert.Contains(t, []string{"add-mask", "group", "endgroup", "error", "warning", "notice"}, name, line)
		}
	}
	assert.NotContains(t, o.log, "::error::x")
}

// The inputs cannot send the statement elsewhere either: a workflow may have
// read them from the artifact.
func TestWorkflowRunWithInputsThatDisagree(t *testing.T) {
	for _, inputs := range []map[string]string{{"pull": "3"}, {"commit": "00000000000000000000000000000000000000aa"}, {"branch": "harbour-works"}} {
		w := forked(t)
		s := w.reported(fork, lean(t, w.head))
		s.inputs = inputs
		o := w.run(s)
		assert.Empty(t, w.api.Comments(3), "%v", inputs)
		assert.Empty(t, w.api.Comments(8), "%v", inputs)
		assert.NotEqual(t, "open", o.outputs["gate"], "%v: %s", inputs, o.log)
	}
}

// A run whose pull request has newer commits, or was merged, asks for nothing.
func TestWorkflowRunThatIsOutOfDate(t *testing.T) {
	w := forked(t)
	s := w.reported(fork, heavy(t, w.head))
	s.payload["workflow_run"].(map[string]any)["head_sha"] = w.base
	o := w.run(s)
	assert.Equal(t, exitDone, o.status, o.complaint)
	assert.Contains(t, o.log, "no open pull request has this commit as its head")
	assert.Equal(t, "unknown", o.outputs["gate"])
	assert.Empty(t, w.api.CheckRuns())
	assert.Empty(t, w.api.Comments(8))
}
