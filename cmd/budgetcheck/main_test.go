package main

import (
	"bytes"
	"errors"
	"flag"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"github.com/rogpeppe/go-internal/testscript"
	"github.com/santhosh-tekuri/jsonschema/v6"
	"github.com/stretchr/testify/require"
)

var update = flag.Bool("update", false, "write the output of scripts into them, where they compare it")

// demoDir is the demo, from this folder.
const demoDir = "../../testdata/demo"

func TestMain(m *testing.M) {
	testscript.Main(m, map[string]func(){"budgetcheck": main})
}

// TestScripts runs the program as people do. Each script has the demo in a
// folder of its own.
func TestScripts(t *testing.T) {
	testscript.Run(t, testscript.Params{
		Dir: "testdata/script", UpdateScripts: *update, RequireExplicitExec: true, RequireUniqueNames: true,
		Setup: func(e *testscript.Env) error {
			e.Setenv("NOW", "2031-03-10T12:00:00Z")
			return os.CopyFS(filepath.Join(e.WorkDir, "demo"), os.DirFS(demoDir))
		},
		Cmds: map[string]func(*testscript.TestScript, bool, []string){"exits": exits, "edit": edit, "fits": fits},
	})
}

// exits runs a command that must end with just this exit status: ! cannot tell
// a closed gate from a policy that nobody could read.
func exits(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 2 {
		ts.Fatalf("usage: exits STATUS COMMAND [ARG]...")
	}
	want, err := strconv.Atoi(args[0])
	ts.Check(err)
	got := 0
	var exit *exec.ExitError
	switch err := ts.Exec(args[1], args[2:]...); {
	case errors.As(err, &exit):
		got = exit.ExitCode()
	case err != nil:
		ts.Fatalf("%v", err)
	}
	if got != want {
		ts.Fatalf("exit status %d, want %d", got, want)
	}
}

// edit replaces a text that must be in the file.
func edit(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 3 {
		ts.Fatalf("usage: edit FILE OLD NEW")
	}
	text := ts.ReadFile(args[0])
	if !strings.Contains(text, args[1]) {
		ts.Fatalf("%s has no %q", args[0], args[1])
	}
	ts.Check(os.WriteFile(ts.MkAbs(args[0]), []byte(strings.ReplaceAll(text, args[1], args[2])), 0o666))
}

// fits checks that a file is one JSON value that fits the schema in report.
func fits(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 2 {
		ts.Fatalf("usage: fits FILE SCHEMA")
	}
	schema, err := jsonschema.NewCompiler().Compile(filepath.Join(start, "../../report", args[1]+".schema.json"))
	ts.Check(err)
	value, err := jsonschema.UnmarshalJSON(strings.NewReader(ts.ReadFile(args[0])))
	ts.Check(err)
	ts.Check(schema.Validate(value))
}

// start is the folder that tests start in; scripts change it.
var start = func() string {
	dir, err := os.Getwd()
	if err != nil {
		panic(err)
	}
	return dir
}()

// binary is the program, built as people build it.
func binary(t testing.TB) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "budgetcheck")
	build := exec.Command("go", "build", "-o", path, ".")
	out, err := build.CombinedOutput()
	require.NoError(t, err, "%s", out)
	return path
}

// Exit statuses as a CI job sees them, through a real process.
func TestExitStatusOfTheBinary(t *testing.T) {
	program := binary(t)
	now := []string{"-now", "2031-03-10T12:00:00Z"}
	for name, c := range map[string]struct {
		args []string
		want int
	}{
		"gate open":       {append([]string{"gate", "-branch", "harbour-works"}, now...), exitDone},
		"gate closed":     {append([]string{"gate", "-branch", "main", "-head", "head/*"}, now...), exitFinding},
		"gate cannot":     {[]string{"gate", "-branch", "main", "-policy", "none.toml"}, exitCannot},
		"weigh done":      {[]string{"weigh", "head/score-tide.ndjson"}, exitDone},
		"weigh finding":   {[]string{"weigh", "README.md"}, exitFinding},
		"vet done":        {[]string{"vet"}, exitDone},
		"vet finding":     {[]string{"vet", "README.md"}, exitFinding},
		"init refuses":    {[]string{"init"}, exitCannot},
		"help":            {[]string{"help"}, exitDone},
		"version":         {[]string{"version"}, exitDone},
		"no command":      {nil, exitCannot},
		"unknown command": {[]string{"open"}, exitCannot},
	} {
		t.Run(name, func(t *testing.T) {
			run := exec.Command(program, c.args...)
			run.Dir = demoDir
			var errs bytes.Buffer
			run.Stderr = &errs
			err := run.Run()
			if c.want != exitDone {
				require.IsType(t, &exec.ExitError{}, err)
			}
			require.Equal(t, c.want, run.ProcessState.ExitCode(), errs.String())
		})
	}
}
