package main

import (
	"bufio"
	"bytes"
	"encoding/json"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"

	"budgetcheck/report/github/apitest"
)

// runner is act with a world, a copy of the action and a stand-in for the step
// that sets up Go.
type runner struct {
	*world
	action, noop, home string
}

func newRunner(t *testing.T) *runner {
	r := &runner{world: newWorld(t, nil), action: actionTree(t), noop: t.TempDir(), home: t.TempDir()}
	write(t, r.noop, map[string]string{"action.yml": "name: noop\ndescription: nothing\nruns:\n  using: composite\n  steps:\n    - run: 'true'\n      shell: bash\n"})
	write(t, r.action, map[string]string{".github/release.sha256": pins("")}) // also the tree of a release is built here
	return r
}

// actionTree is a copy of what the action consists of.
func actionTree(t *testing.T) string {
	t.Helper()
	root, dir := filepath.Join(start, "..", ".."), t.TempDir()
	for _, name := range []string{"action.yml", "go.mod", "go.sum", ".github", "cmd", "budget", "report"} {
		from := filepath.Join(root, name)
		if info, err := os.Stat(from); err == nil && info.IsDir() {
			require.NoError(t, os.CopyFS(filepath.Join(dir, name), os.DirFS(from)))
			continue
		}
		write(t, dir, map[string]string{name: text(t, from)})
	}
	return dir
}

// gateWorkflow is what a repository writes to use the action.
const gateWorkflow = `on: [pull_request, push, schedule, workflow_run]
jobs:
  gate:
    runs-on: ubuntu-latest
    steps:
      - uses: actions/checkout@11bd71901bbe5b1630ceea73d27597364c9af683
      - uses: harbour/budgetcheck@v1
        id: gate
        with:
          head: records/*.ndjson
      - name: Outputs are there
        if: always()
        shell: bash
        env:
          GATE: ${{ steps.gate.outputs.gate }}
          TOTAL: ${{ steps.gate.outputs.total-g }}
          PAGE: ${{ steps.gate.outputs.statement-md }}
        run: echo "seen $GATE $TOTAL $(head -c 8 "$PAGE")"
`

// seen is what came of a run under act.
type seen struct {
	passed  bool
	outputs map[string]string
	summary string
	log     string
}

// act runs the workflow on an event, in a workspace with records.
func (r *runner) act(s step) (o seen) {
	r.t.Helper()
	if s.dir == "" {
		s.dir = r.clone("main")
	}
	event, err := json.Marshal(s.payload)
	require.NoError(r.t, err)
	write(r.t, s.dir, s.records)
	write(r.t, s.dir, map[string]string{".github/workflows/gate.yml": gateWorkflow})
	write(r.t, r.home, map[string]string{"event.json": string(event)})
	cmd := exec.Command(tool(r.t, "act"), r.arguments(s)...)
	cmd.Dir, cmd.Env = s.dir, append(r.goes(), "ACT_DISABLE_VERSION_CHECK=1")
	var out bytes.Buffer
	cmd.Stdout, cmd.Stderr = &out, &out
	o.passed = cmd.Run() == nil
	o.log, o.outputs = out.String(), map[string]string{}
	r.read(&o)
	return o
}

func (r *runner) arguments(s step) []string {
	setup := "actions/setup-go@" + between(text(r.t, filepath.Join(r.action, "action.yml")), "actions/setup-go@", " ")
	args := []string{s.event, "-W", ".github/workflows/gate.yml", "-e", filepath.Join(r.home, "event.json"), "--json",
		"-P", "ubuntu-latest=-self-hosted", "--no-cache-server", "--action-cache-path", filepath.Join(r.home, "cache"), "--actor", "keeper",
		"--local-repository", "harbour/budgetcheck@v1=" + r.action, "--local-repository", setup + "=" + r.noop, "-s", "GITHUB_TOKEN=" + apitest.Token}
	env := []string{"GITHUB_API_URL=" + r.host().URL, "GITHUB_SERVER_URL=" + r.host().URL, "GITHUB_GRAPHQL_URL=" + r.host().URL + "/graphql",
		"GITHUB_REPOSITORY=" + home, "SHA_REF=" + s.sha, "GITHUB_REF=" + s.ref, "GITHUB_RUN_ID=4242", "BUDGETCHECK_NOW=2031-03-10T12:00:00Z"}
	for _, e := range slices.Concat(env, r.goes()) {
		args = append(args, "--env", e)
	}
	return args
}

// goes is the clean environment of a machine that has Go and the modules, and
// no network.
func (r *runner) goes() []string {
	out, err := exec.Command("go", "env", "GOMODCACHE", "GOCACHE").Output()
	require.NoError(r.t, err)
	dirs := strings.Fields(string(out))
	return []string{"HOME=" + r.home, "PATH=" + os.Getenv("PATH"), "GOMODCACHE=" + dirs[0], "GOCACHE=" + dirs[1], "GOPROXY=off", "GOTOOLCHAIN=local"}
}

// read takes outputs and summary of the action's own step from the log.
func (r *runner) read(o *seen) {
	lines := bufio.NewScanner(strings.NewReader(o.log))
	lines.Buffer(nil, 16<<20)
	for lines.Scan() {
		var l struct {
			Command, Name, Arg, Content string
			StepID                      []string
		}
		if json.Unmarshal(lines.Bytes(), &l) != nil {
			continue
		}
		switch l.Command {
		case "set-output":
			o.outputs[l.Name] = l.Arg
		case "summary":
			o.summary += l.Content
		}
	}
	require.NoError(r.t, lines.Err())
}

func between(text, from, to string) string {
	_, text, _ = strings.Cut(text, from)
	text, _, _ = strings.Cut(text, to)
	return text
}

// tool is a program that .github/test.sh installs.
func tool(t *testing.T, name string) string {
	t.Helper()
	path, err := exec.LookPath(name)
	if err != nil {
		gopath, _ := exec.Command("go", "env", "GOPATH").Output()
		path, err = exec.LookPath(filepath.Join(strings.TrimSpace(string(gopath)), "bin", name))
	}
	require.NoError(t, err, "%s is not installed; .github/test.sh does that", name)
	return path
}
