package main

import (
	"bytes"
	"path/filepath"
	"testing"
	"time"

	"github.com/stretchr/testify/require"

	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// targetPolicy lets a training run emit 150 g.
const targetPolicy = `format = 1

[grid]
series = ["grid/*.csv"]

[site.quay-north]
zone = "NORTH"
pue = 1.0

[machine.quad]
units = 4
measured_share = 1.0
meters = 4

[[job]]
name = "retrain-tide"
stage = "training"
required = true
paths = ["tide/**"]

[[budget]]
name = "one training"
branch = "main"
job = "retrain-tide"
limit = "150 g"
per = "run"
`

// steady is 100 g/kWh all month, so that a kilowatt for an hour is 100 g.
const steady = "zone,from,to,g_per_kwh,factor\nNORTH,2031-03-01T00:00:00Z,2031-03-12T00:00:00Z,100,average\n"

// training is the record of a run of retrain-tide on a commit: an hour at so
// many watts for each of four meters.
func training(t *testing.T, run, commit string, watts float64, changes ...func(*record.Open)) string {
	t.Helper()
	at := unit.At(time.Date(2031, 3, 10, 2, 0, 0, 0, time.UTC))
	open := record.Open{Run: run, Attempt: 1, Job: "retrain-tide", Stage: "training", At: at, Site: "quay-north", Machine: "quad", Host: "mole-1", Commit: commit}
	for _, change := range changes {
		change(&open)
	}
	var b bytes.Buffer
	w := record.NewWriter(&b)
	require.NoError(t, w.Open(open))
	for n := range 61 {
		for _, meter := range []string{"gpu0", "gpu1", "gpu2", "gpu3"} {
			require.NoError(t, w.Power(at.Add(unit.Duration(n)*unit.Minute), meter, unit.Power(watts)))
		}
	}
	require.NoError(t, w.Work(at.Add(unit.Hour), record.Work{Unit: "step", Done: 1000}))
	require.NoError(t, w.Close(at.Add(unit.Hour), record.OK))
	return b.String()
}

// lean and heavy are records of 100 g and 200 g, in a workspace.
func lean(t *testing.T, commit string) map[string]string {
	return map[string]string{"records/night.ndjson": training(t, "n1", commit, 250)}
}

func heavy(t *testing.T, commit string) map[string]string {
	return map[string]string{"records/night.ndjson": training(t, "n1", commit, 500)}
}

// clone clones the repository at a branch, with further arguments of git clone.
func (w *world) clone(branch string, args ...string) string {
	w.t.Helper()
	dir := filepath.Join(w.t.TempDir(), "a workspace")
	w.repo.Git(append([]string{"clone", "--quiet", "--branch", branch, "file://" + filepath.ToSlash(w.repo.Dir), dir}, args...)...)
	return dir
}

// Payloads of events: the keys that the action reads.

func repository(name string) map[string]any {
	id := map[string]int{home: 7001, fork: 7002}[name]
	return map[string]any{"id": id, "full_name": name, "default_branch": "main"}
}

// pullEvent is pull request 7 from topic of a repository.
func (w *world) pullEvent(from string) map[string]any {
	return map[string]any{"action": "synchronize", "number": 7, "repository": repository(home), "pull_request": map[string]any{
		"number": 7,
		"head":   map[string]any{"ref": "topic", "sha": w.head, "repo": repository(from)},
		"base":   map[string]any{"ref": "main", "sha": w.base, "repo": repository(home)}}}
}

// runEvent reports the run of another workflow for a pull request.
func (w *world) runEvent(from string) map[string]any {
	return map[string]any{"action": "completed", "repository": repository(home), "workflow_run": map[string]any{
		"id": 99, "event": "pull_request", "head_branch": "topic", "head_sha": w.head, "head_repository": repository(from), "pull_requests": []any{}}}
}

// pull is the ordinary step: a pull request of the repository itself.
func (w *world) pull(records map[string]string) step {
	return step{event: "pull_request", payload: w.pullEvent(home), sha: "00000000000000000000000000000000000000aa", ref: "refs/pull/7/merge", records: records}
}
