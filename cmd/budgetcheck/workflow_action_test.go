package main

import (
	"maps"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

func actionFile(t *testing.T) (string, actionYAML) {
	t.Helper()
	path := filepath.Join(start, "../../action.yml")
	return path, parse[actionYAML](t, path)
}

// judging is the step that runs the program.
func judging(t *testing.T, a actionYAML) stepYAML {
	t.Helper()
	at := slices.IndexFunc(a.Runs.Steps, func(s stepYAML) bool { return s.ID == "judge" })
	require.GreaterOrEqual(t, at, 0)
	return a.Runs.Steps[at]
}

func TestAction(t *testing.T) {
	path, a := actionFile(t)
	checkTags(t, path)
	assert.Equal(t, "composite", a.Runs.Using)
	for _, s := range a.Runs.Steps {
		checkStep(t, path+": "+s.Name, s)
		if s.Run != "" {
			assert.Equal(t, "bash", s.Shell, "%s: the host demands a shell, and only bash is everywhere", s.Name)
		}
	}
	for name, in := range a.Inputs {
		assert.NotEmpty(t, in.Description, name)
	}
	for name, out := range a.Outputs {
		assert.NotEmpty(t, out.Description, name)
		assert.Equal(t, "${{ steps.judge.outputs."+name+" }}", out.Value)
	}
}

// Inputs and outputs are those that users were promised.
func TestActionInputsAndOutputs(t *testing.T) {
	_, a := actionFile(t)
	assert.ElementsMatch(t, []string{"policy", "head", "base", "grid", "ledger", "job", "name", "branch", "pull", "commit", "token", "out", "post", "book", "await", "enforce"},
		slices.Collect(maps.Keys(a.Inputs)))
	assert.ElementsMatch(t, []string{"gate", "total-g", "held-ratio", "statement-md", "statement-json"}, slices.Collect(maps.Keys(a.Outputs)))
}

// Each input goes into the environment and no other way, and the program looks
// at each that the action has.
func TestActionInputsAreRead(t *testing.T) {
	_, a := actionFile(t)
	env := judging(t, a).Env
	asked := map[string]bool{}
	_, err := readInputs(func(key string) string { asked[key] = true; return "" })
	require.NoError(t, err)
	want := map[string]bool{}
	for name := range a.Inputs {
		key := "INPUT_" + strings.ToUpper(name)
		want[key] = true
		assert.Equal(t, "${{ inputs."+name+" }}", env[key])
	}
	for key := range env {
		assert.True(t, want[key] || key == "PROGRAM", key)
	}
	assert.Equal(t, want, asked)
}

// The program writes each output that the action hands on.
func TestActionOutputsAreWritten(t *testing.T) {
	_, a := actionFile(t)
	w := newWorld(t, nil)
	o := w.run(w.pull(lean(t, w.head)))
	assert.ElementsMatch(t, slices.Collect(maps.Keys(a.Outputs)), slices.Collect(maps.Keys(o.outputs)))
}

// The text of an input may be anything but a boolean where one is expected.
func TestReadInputs(t *testing.T) {
	read := func(pairs ...string) (actionInputs, error) {
		env := map[string]string{}
		for n := 0; n < len(pairs); n += 2 {
			env["INPUT_"+strings.ToUpper(pairs[n])] = pairs[n+1]
		}
		return readInputs(func(key string) string { return env[key] })
	}
	in, err := read("head", " a b/*.ndjson \r\n\n\tc.ndjson", "post", "comment,check\n summary", "await", "TRUE", "enforce", "False", "out", " page ")
	require.NoError(t, err)
	assert.Equal(t, []string{"a b/*.ndjson", "c.ndjson"}, in.head)
	assert.Equal(t, []string{"comment", "check", "summary"}, in.post)
	assert.Equal(t, []any{true, false, "page"}, []any{in.await, in.enforce, in.out})
	in, err = read()
	require.NoError(t, err)
	assert.Equal(t, []any{false, true, "budgetcheck-statement", []string{"budgetcheck.toml"}, []string(nil)}, []any{in.await, in.enforce, in.out, in.policy, in.head})
	_, err = read("await", "yes", "enforce", "no")
	assert.ErrorContains(t, err, `the input await is "yes"`)
	assert.ErrorContains(t, err, `the input enforce is "no"`, "all that is wrong is told at once")
}
