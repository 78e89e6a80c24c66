package main

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/report/github/apitest"
)

func TestNameOfCheckAndComment(t *testing.T) {
	w := newWorld(t, nil)
	s := w.pull(lean(t, w.head))
	require.Equal(t, exitDone, w.run(s).status)
	s.inputs = map[string]string{"name": "night gate"}
	require.Equal(t, exitDone, w.run(s).status)
	assert.Len(t, w.api.Comments(7), 2, "each gate has a comment of its own")
	require.Len(t, w.api.CheckRuns(), 2)
	assert.Equal(t, "night gate", w.api.CheckRuns()[1].Name)
}

// Where the token may not write checks, a commit status takes their place.
func TestStatusInsteadOfACheck(t *testing.T) {
	for want, records := range map[string]func(*testing.T, string) map[string]string{"success": lean, "failure": heavy} {
		w := newWorld(t, nil)
		w.open().Refuse("", "check-runs")
		o := w.run(w.pull(records(t, w.head)))
		assert.Equal(t, want == "success", o.status == exitDone)
		assert.Empty(t, w.api.CheckRuns())
		require.Len(t, w.api.Statuses(), 1)
		got := w.api.Statuses()[0]
		assert.Equal(t, []string{w.head, want, "budgetcheck"}, []string{got.SHA, got.State, got.Context})
		assert.Len(t, w.api.Comments(7), 1)
		assert.NotContains(t, o.log, "::warning title", "nothing went wrong")
	}
}

// A forge has comments and statuses, and no checks.
func TestForge(t *testing.T) {
	w := newWorld(t, nil)
	w.options.Forge, w.options.As = true, apitest.Person("budget-keeper")
	require.Equal(t, exitDone, w.run(w.pull(lean(t, w.head))).status)
	o := w.run(w.pull(heavy(t, w.head)))
	require.Equal(t, exitFinding, o.status, "%s%s", o.log, o.complaint)
	require.Len(t, w.api.Comments(7), 1, "edited in place")
	assert.Contains(t, w.api.Comments(7)[0].Body, "Gate closed")
	var states []string
	for _, s := range w.api.Statuses() {
		states = append(states, s.State)
	}
	assert.Equal(t, []string{"success", "failure"}, states)
}

// While only records are missing, the posted check waits and the step passes.
func TestAwait(t *testing.T) {
	w := newWorld(t, nil)
	s := w.pull(nil)
	s.inputs = map[string]string{"await": "true"}
	o := w.run(s)
	require.Equal(t, exitDone, o.status, "%s%s", o.log, o.complaint)
	assert.Equal(t, "unknown", o.outputs["gate"])
	c := w.api.CheckRuns()[0]
	assert.Equal(t, []string{"in_progress", ""}, []string{c.Status, c.Conclusion})
	assert.Empty(t, c.Annotations)
	// The record arrives, and the same check is completed.
	s.records = heavy(t, w.head)
	o = w.run(s)
	assert.Equal(t, exitFinding, o.status)
	assert.Equal(t, "closed", o.outputs["gate"])
	require.Len(t, w.api.CheckRuns(), 1)
	assert.Equal(t, "failure", w.api.CheckRuns()[0].Conclusion)
	assert.Len(t, w.api.Comments(7), 1)
}

// Nothing but missing records is waited for.
func TestAwaitDoesNotHideARuling(t *testing.T) {
	for name, records := range map[string]func(*testing.T, string) map[string]string{
		"over":           heavy,
		"another commit": func(t *testing.T, _ string) map[string]string { return lean(t, strings.Repeat("a", 40)) },
		"not a record":   func(*testing.T, string) map[string]string { return map[string]string{"records/x.ndjson": "{\n"} },
	} {
		w := newWorld(t, nil)
		s := w.pull(records(t, w.head))
		s.inputs = map[string]string{"await": "true"}
		assert.Equal(t, exitFinding, w.run(s).status, name)
		assert.Equal(t, "completed", w.api.CheckRuns()[0].Status, name)
	}
}

// enforce = false reports and passes, but what could not be judged stays 2.
func TestReportOnly(t *testing.T) {
	w := newWorld(t, nil)
	s := w.pull(heavy(t, w.head))
	s.inputs = map[string]string{"enforce": "false"}
	o := w.run(s)
	assert.Equal(t, exitDone, o.status)
	assert.Equal(t, "closed", o.outputs["gate"], "it is not hidden from later steps")
	c := w.api.CheckRuns()[0]
	assert.Equal(t, "neutral", c.Conclusion)
	assert.Contains(t, c.Title, "Report only.")
	s.inputs["policy"] = "none.toml"
	o = w.run(s)
	assert.Equal(t, exitCannot, o.status)
	assert.Equal(t, "unknown", o.outputs["gate"])
	assert.Contains(t, o.complaint, "there is no policy none.toml")
	assert.Contains(t, w.api.Comments(7)[0].Body, "there is no policy none.toml", "and it is told")
}

func TestPostNothing(t *testing.T) {
	w := newWorld(t, nil)
	s := w.pull(heavy(t, w.head))
	s.inputs = map[string]string{"post": ""}
	o := w.run(s)
	assert.Equal(t, exitFinding, o.status)
	assert.Empty(t, o.summary)
	assert.NotEmpty(t, o.statement, "the files are written")
	for _, c := range w.api.Calls() {
		assert.Equal(t, "GET", c.Method)
		assert.NotContains(t, c.Path, "comments")
	}
}

func TestInputsThatAreWrong(t *testing.T) {
	for name, want := range map[string]string{"post": "the input post has the word", "await": "the input await is", "enforce": "the input enforce is", "book": "the input book is", "pull": "the input pull is"} {
		w := newWorld(t, nil)
		s := w.pull(lean(t, w.head))
		s.inputs = map[string]string{name: "pigeon"}
		o := w.run(s)
		assert.Equal(t, exitCannot, o.status, name)
		assert.Contains(t, o.complaint, want)
		assert.Equal(t, "unknown", o.outputs["gate"])
	}
}

// A host that stays down changes no ruling, and that nothing was posted is
// said. It asks to wait longer than anybody would, so that the test need not.
func TestHostDownWhenPosting(t *testing.T) {
	for want, records := range map[int]func(*testing.T, string) map[string]string{exitDone: lean, exitFinding: heavy} {
		w := newWorld(t, nil)
		for _, path := range []string{"check-runs", "statuses", "comments"} {
			w.host().Plant(apitest.Fault{Path: path, Status: 503, Header: map[string]string{"Retry-After": "3600"}})
		}
		s := w.pull(records(t, w.head))
		s.dir = w.clone("topic")
		o := w.run(s)
		assert.Equal(t, want, o.status, o.complaint)
		assert.Contains(t, o.log, "::warning::check: ")
		assert.Contains(t, o.log, "::warning::comment: ")
		assert.Contains(t, o.summary, "one training")
		assert.Empty(t, w.api.Comments(7))
	}
}

// Without a clone and without the host, nothing can be judged: that is not a
// closed gate, and no open one either.
func TestHostDownWhenReading(t *testing.T) {
	w := newWorld(t, nil)
	w.host().Plant(apitest.Fault{Status: 503, Header: map[string]string{"Retry-After": "3600"}})
	s := w.pull(lean(t, w.head))
	s.inputs = map[string]string{"enforce": "false"}
	o := w.run(s)
	assert.Equal(t, exitCannot, o.status)
	assert.Equal(t, "unknown", o.outputs["gate"])
	assert.Contains(t, o.complaint, "503")
	assert.Contains(t, o.summary, "503")
	// With a clone that has all commits, the ruling needs no host.
	s.dir, s.inputs = w.clone("topic"), nil
	o = w.run(s)
	assert.Equal(t, exitDone, o.status, o.complaint)
	assert.Equal(t, "open", o.outputs["gate"])
}

// Hosts have been known to repeat a token in a refusal; run looks for it.
func TestRefusalWithTheToken(t *testing.T) {
	w := newWorld(t, nil)
	w.host().Plant(apitest.Fault{Method: "POST", Path: "comments", Status: 422, Body: `{"message":"no: ` + apitest.Token + `"}`})
	o := w.run(w.pull(heavy(t, w.head)))
	assert.Equal(t, exitFinding, o.status)
	assert.Contains(t, o.log, "no: ***")
}

// Where the token may write nothing, the exit status is that of the ruling, and
// why nothing was posted is said without alarm.
func TestNothingMayBeWritten(t *testing.T) {
	for want, records := range map[int]func(*testing.T, string) map[string]string{exitDone: lean, exitFinding: heavy} {
		w := newWorld(t, nil)
		w.host().Refuse("POST", "")
		o := w.run(w.pull(records(t, w.head)))
		assert.Equal(t, want, o.status)
		assert.Contains(t, o.log, "::notice::comment: not posted, for the token may not add a comment to this pull request")
		assert.Contains(t, o.log, "::notice::status: not posted, for the token may not add a check or status to this commit")
		assert.NotContains(t, o.log, "::warning::comment")
	}
}

// A glob that matches nothing is most often a mistake, and is named.
func TestGlobsThatMatchNothing(t *testing.T) {
	w := newWorld(t, nil)
	s := w.pull(lean(t, w.head))
	s.inputs = map[string]string{"head": "recrods/*.ndjson", "base": "before/*.ndjson"}
	o := w.run(s)
	assert.Equal(t, exitFinding, o.status)
	assert.Contains(t, o.statement, "no file matches recrods/*.ndjson (head)")
	assert.Contains(t, o.statement, "no file matches before/*.ndjson (base)")
	s.inputs = map[string]string{"head": "records/[*.ndjson"}
	o = w.run(s)
	assert.Equal(t, exitCannot, o.status)
	assert.Contains(t, o.complaint, "is not a glob")
}
