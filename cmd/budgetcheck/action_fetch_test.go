package main

import (
	"bytes"
	"crypto/sha256"
	"fmt"
	"net/http"
	"net/http/httptest"
	"os"
	"os/exec"
	"path/filepath"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// released is what a release would serve; it must not be run.
const released = "#!/bin/sh\necho ran\n"

// pins is the file of a release in which some assets are pinned.
func pins(tag string, assets ...string) string {
	text := "# SHA-256 of the released programs.\n"
	if tag != "" {
		text += "# tag " + tag + "\n"
	}
	for _, asset := range assets {
		text += fmt.Sprintf("%x  %s\n", sha256.Sum256([]byte(released)), asset)
	}
	return text
}

// fetch runs fetch.sh of an action's tree with these pins. It tells what it
// wrote into the file of outputs and what it asked the server for.
func fetch(t *testing.T, pins, served string, env ...string) (output, log string, asked []string, err error) {
	t.Helper()
	server := httptest.NewServer(http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		asked = append(asked, r.URL.Path)
		if served == "" {
			http.NotFound(w, r)
			return
		}
		fmt.Fprint(w, served)
	}))
	defer server.Close()
	dir := filepath.Join(t.TempDir(), "a folder")
	script := text(t, filepath.Join(start, "../../.github/fetch.sh"))
	write(t, dir, map[string]string{".github/fetch.sh": script, ".github/release.sha256": pins, "go.mod": "module budgetcheck\n\ngo 1.26.8\n", "output": "", "temp/x": ""})
	tool(t, "curl")
	cmd := exec.Command("bash", filepath.Join(dir, ".github/fetch.sh"))
	cmd.Env = append(os.Environ(), "RUNNER_OS=Linux", "RUNNER_ARCH=X64", "RUNNER_TEMP="+filepath.Join(dir, "temp"), "GITHUB_SERVER_URL="+server.URL,
		"ACTION_REPOSITORY=harbour/budgetcheck", "GITHUB_OUTPUT="+filepath.Join(dir, "output"), "no_proxy=127.0.0.1")
	cmd.Env = append(cmd.Env, env...)
	var out bytes.Buffer
	cmd.Stdout, cmd.Stderr = &out, &out
	err = cmd.Run()
	return text(t, filepath.Join(dir, "output")), out.String(), asked, err
}

func TestFetchOfAPinnedProgram(t *testing.T) {
	for asset, env := range map[string][]string{
		"budgetcheck_linux_amd64":       nil,
		"budgetcheck_darwin_arm64":      {"RUNNER_OS=macOS", "RUNNER_ARCH=ARM64"},
		"budgetcheck_windows_amd64.exe": {"RUNNER_OS=Windows"},
	} {
		output, log, asked, err := fetch(t, pins("v1.2.3", "budgetcheck_other", asset), released, env...)
		require.NoError(t, err, log)
		assert.Regexp(t, "^program=.*/a folder/temp/"+asset+"\n$", output)
		assert.Equal(t, []string{"/harbour/budgetcheck/releases/download/v1.2.3/" + asset}, asked)
	}
}

// What is not the pinned program is an error, and no program for later steps.
func TestFetchOfAnotherProgram(t *testing.T) {
	output, log, asked, err := fetch(t, pins("v1.2.3", "budgetcheck_linux_amd64"), released+"echo more\n")
	require.Error(t, err)
	assert.Len(t, asked, 1)
	assert.Empty(t, output)
	assert.Contains(t, log, "::error::budgetcheck_linux_amd64 of v1.2.3 has the SHA-256 ")
	assert.NotContains(t, log, "ran\n")
}

// Without a pin nothing is fetched, and without an asset nothing is taken: the
// action then builds from source.
func TestFetchOfNothing(t *testing.T) {
	whole := pins("v1.2.3", "budgetcheck_linux_amd64")
	for name, c := range map[string]struct {
		pins, served string
		env          []string
		asked        int
	}{
		"no tag":             {pins("", "budgetcheck_linux_amd64"), released, nil, 0},
		"another machine":    {whole, released, []string{"RUNNER_ARCH=ARM64"}, 0},
		"unknown machine":    {whole, released, []string{"RUNNER_OS=Plan9"}, 0},
		"a local action":     {whole, released, []string{"ACTION_REPOSITORY="}, 0},
		"the asset is away":  {whole, "", nil, 1},
		"a longer name only": {pins("v1.2.3", "budgetcheck_linux_amd64.sig"), released, nil, 0},
	} {
		output, log, asked, err := fetch(t, c.pins, c.served, c.env...)
		require.NoError(t, err, "%s: %s", name, log)
		assert.Equal(t, "go=1.26.8\n", output, "%s: no program, and what to build one with", name)
		assert.Len(t, asked, c.asked, name)
		assert.Contains(t, log, "building from source", name)
	}
}

// One source gives the same bytes wherever it lies and wherever the program
// goes: only so can a release be checked by building it again.
func TestBuildIsReproducible(t *testing.T) {
	if testing.Short() {
		t.Skip("it builds the program twice")
	}
	build := func(source, out string) []byte {
		cmd := exec.Command("bash", filepath.Join(source, ".github/build.sh"), out)
		cmd.Dir = t.TempDir()
		said := filepath.Join(cmd.Dir, "output")
		cmd.Env = append(os.Environ(), "GITHUB_OUTPUT="+said, "GOPROXY=off")
		log, err := cmd.CombinedOutput()
		require.NoError(t, err, "%s", log)
		assert.Equal(t, "program="+out+"\n", text(t, said))
		data, err := os.ReadFile(out)
		require.NoError(t, err)
		return data
	}
	one := build(filepath.Join(start, "../.."), filepath.Join(t.TempDir(), "one"))
	two := build(actionTree(t), filepath.Join(t.TempDir(), "a folder", "another"))
	require.Greater(t, len(one), 1<<20)
	assert.True(t, bytes.Equal(one, two), "%d and %d bytes", len(one), len(two))
	assert.NotContains(t, string(one), filepath.Dir(filepath.Dir(start))+"/cmd", "no path of this machine")
}
