package main

import (
	"bytes"
	"encoding/json"
	"maps"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/report/github/apitest"
)

// home is the repository of these tests, and fork a fork of it.
const (
	home = "harbour/tides"
	fork = "spring-tide/tides"
)

// world is a code host with one repository: main with a policy, and topic with
// a change to the training.
type world struct {
	t          *testing.T
	repo       *apitest.Repo
	api        *apitest.Server
	options    apitest.Options
	base, head string // tip of main when topic left it, and of topic
}

// newWorld lets the caller say what topic changes besides the training.
func newWorld(t *testing.T, also map[string]string) *world {
	t.Helper()
	w := &world{t: t, repo: apitest.NewRepo(t), options: apitest.Options{Repository: home}}
	w.base = w.repo.Commit("start", map[string]string{policyName: targetPolicy, "grid/march.csv": steady,
		"tide/train.py": "epochs = 10\n", "docs/tides.md": "Tides.\n"})
	w.repo.Branch("topic", w.base)
	change := map[string]string{"tide/train.py": "epochs = 12\n"}
	maps.Copy(change, also)
	w.head = w.repo.Commit("train longer", change)
	return w
}

// open starts the host, with pull request 7 from topic.
func (w *world) open() *apitest.Server {
	w.options.Git = w.repo.Dir
	w.api = apitest.New(w.t, w.options)
	w.api.AddPull(apitest.Pull{Number: 7, Head: apitest.Branch{Ref: "topic", SHA: w.head}, Base: apitest.Branch{Ref: "main", SHA: w.base}})
	return w.api
}

// host is the code host, started when it is first needed.
func (w *world) host() *apitest.Server {
	if w.api == nil {
		w.open()
	}
	return w.api
}

// step is one step of a job that uses the action.
type step struct {
	event   string
	payload map[string]any
	sha     string // GITHUB_SHA
	ref     string // GITHUB_REF
	dir     string // the workspace; a new folder without a clone if empty
	inputs  map[string]string
	env     map[string]string
	records map[string]string // by path in the workspace
}

// outcome is what the step leaves behind.
type outcome struct {
	status             int
	outputs            map[string]string
	log, complaint     string
	summary, statement string
	dir                string
}

// run runs the step as the runner does, in its workspace.
func (w *world) run(s step) outcome {
	w.t.Helper()
	w.host()
	if s.dir == "" {
		s.dir = w.t.TempDir()
	}
	write(w.t, s.dir, s.records)
	w.t.Chdir(s.dir)
	env := s.environment(w)
	var out, errs bytes.Buffer
	o := outcome{dir: s.dir}
	o.status = run([]string{"action"}, streams{out: &out, err: &errs, getenv: func(k string) string { return env[k] },
		clock: func() time.Time { return time.Date(2031, 3, 10, 12, 0, 0, 0, time.UTC) }})
	o.log, o.complaint = out.String(), errs.String()
	o.summary, o.outputs = text(w.t, env["GITHUB_STEP_SUMMARY"]), readOutputs(w.t, env["GITHUB_OUTPUT"])
	if path := o.outputs["statement-md"]; path != "" {
		o.statement = text(w.t, path)
	}
	w.noToken(o)
	return o
}

// environment is what the runner and action.yml set.
func (s step) environment(w *world) map[string]string {
	dir := w.t.TempDir()
	event := filepath.Join(dir, "event.json")
	payload, err := json.Marshal(s.payload)
	require.NoError(w.t, err)
	write(w.t, dir, map[string]string{"event.json": string(payload), "output": "", "summary": ""})
	env := map[string]string{"GITHUB_ACTIONS": "true", "GITHUB_API_URL": w.api.URL, "GITHUB_SERVER_URL": "https://harbour.example",
		"GITHUB_RUN_ID": "4242", "GITHUB_REPOSITORY": home, "GITHUB_EVENT_NAME": s.event, "GITHUB_EVENT_PATH": event,
		"GITHUB_SHA": s.sha, "GITHUB_REF": s.ref,
		"GITHUB_OUTPUT": filepath.Join(dir, "output"), "GITHUB_STEP_SUMMARY": filepath.Join(dir, "summary"),
		"INPUT_TOKEN": apitest.Token, "INPUT_POLICY": policyName, "INPUT_HEAD": "records/**/*.ndjson", "INPUT_NAME": "budgetcheck",
		"INPUT_OUT": "budgetcheck-statement", "INPUT_POST": "comment, check, summary", "INPUT_BOOK": "false", "INPUT_AWAIT": "false", "INPUT_ENFORCE": "true"}
	for key, value := range s.inputs {
		env["INPUT_"+strings.ToUpper(key)] = value
	}
	maps.Copy(env, s.env)
	return env
}

// noToken looks for the token everywhere but in the command that hides it.
func (w *world) noToken(o outcome) {
	w.t.Helper()
	first, rest, _ := strings.Cut(o.log, "\n")
	assert.True(w.t, first == "::add-mask::"+apitest.Token || !strings.Contains(first, apitest.Token), "the token is masked before all else")
	for _, text := range []string{rest, o.complaint, o.summary, o.statement} {
		assert.NotContains(w.t, text, apitest.Token)
	}
	for _, call := range w.api.Calls() {
		assert.NotContains(w.t, call.Path+call.Body, apitest.Token)
	}
}

func write(t *testing.T, dir string, files map[string]string) {
	t.Helper()
	for name, content := range files {
		path := filepath.Join(dir, filepath.FromSlash(name))
		require.NoError(t, os.MkdirAll(filepath.Dir(path), 0o777))
		require.NoError(t, os.WriteFile(path, []byte(content), 0o666))
	}
}

func text(t *testing.T, path string) string {
	t.Helper()
	data, err := os.ReadFile(path)
	require.NoError(t, err)
	return string(data)
}

// readOutputs reads the file of outputs as a runner does: a name, a delimiter,
// and lines up to it.
func readOutputs(t *testing.T, path string) map[string]string {
	t.Helper()
	outputs := map[string]string{}
	lines := strings.Split(text(t, path), "\n")
	for n := 0; n < len(lines) && lines[n] != ""; n++ {
		name, end, ok := strings.Cut(lines[n], "<<")
		require.True(t, ok, "a runner cannot read %q", lines[n])
		var value []string
		for n++; lines[n] != end; n++ {
			value = append(value, lines[n])
		}
		outputs[name] = strings.Join(value, "\n")
	}
	return outputs
}
