package main

import (
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"go.yaml.in/yaml/v3"
)

// stepYAML is a step of a workflow or a composite action.
type stepYAML struct {
	Name, ID, Uses, Run, Shell, If string
	With, Env                      map[string]string
}

type workflowYAML struct {
	Permissions yaml.Node
	Jobs        map[string]struct {
		Permissions map[string]string
		Steps       []stepYAML
	}
}

type actionYAML struct {
	Inputs  map[string]struct{ Description string }
	Outputs map[string]struct{ Description, Value string }
	Runs    struct {
		Using string
		Steps []stepYAML
	}
}

func parse[T any](t *testing.T, path string) (v T) {
	t.Helper()
	require.NoError(t, yaml.Unmarshal([]byte(text(t, path)), &v), path)
	return v
}

// workflows are those of this repository and those for users.
func workflows(t *testing.T) (paths []string) {
	t.Helper()
	for _, folder := range []string{"workflows", "examples"} {
		found, err := filepath.Glob(filepath.Join(start, "../../.github", folder, "*.yml"))
		require.NoError(t, err)
		require.NotEmpty(t, found, folder)
		paths = append(paths, found...)
	}
	return paths
}

func scripts(t *testing.T) []string {
	t.Helper()
	found, err := filepath.Glob(filepath.Join(start, "../../.github/*.sh"))
	require.NoError(t, err)
	require.NotEmpty(t, found)
	return found
}

// untrusted is text that somebody outside may choose, or that a caller gives:
// in a script it would be code.
var untrusted = regexp.MustCompile(`\$\{\{`)

// checkStep checks what no linter looks for.
func checkStep(t *testing.T, where string, s stepYAML) {
	t.Helper()
	assert.False(t, untrusted.MatchString(s.Run), "%s: an expression in a script; hand it over in env: %s", where, s.Run)
	if s.Uses != "" {
		checkUses(t, where, s.Uses)
	}
}

// pinned is an action by the full id of its commit.
var pinned = regexp.MustCompile(`^[\w.-]+/[\w./-]+@[0-9a-f]{40}$`)

func checkUses(t *testing.T, where, uses string) {
	t.Helper()
	own := uses == "./" || uses == "harbour/budgetcheck@v1" && strings.Contains(where, "examples")
	assert.True(t, own || pinned.MatchString(uses), "%s: %s is not pinned by a commit", where, uses)
}

// Behind each pin stands the tag that it was, for people.
func checkTags(t *testing.T, path string) {
	t.Helper()
	for line := range strings.Lines(text(t, path)) {
		if _, uses, ok := strings.Cut(line, "uses: "); ok && pinned.MatchString(strings.Fields(uses)[0]) {
			assert.Regexp(t, `@[0-9a-f]{40} # v\d+\.\d+\.\d+$`, strings.TrimSpace(uses), path)
		}
	}
}

func TestWorkflows(t *testing.T) {
	for _, path := range workflows(t) {
		w := parse[workflowYAML](t, path)
		checkTags(t, path)
		granted := checkPermissions(t, path, w.Permissions)
		require.NotEmpty(t, w.Jobs, path)
		for name, job := range w.Jobs {
			require.NotEmpty(t, job.Steps, "%s: %s", path, name)
			for _, s := range job.Steps {
				checkStep(t, path+": "+name, s)
				// Whoever may write content books, and runs no code of a change.
				if strings.Contains(path, "examples") && (granted["contents"] == "write" || job.Permissions["contents"] == "write") {
					assert.Empty(t, s.Run, "%s: %s", path, name)
				}
			}
		}
	}
}

// checkPermissions asks for a list at the top: without one, a workflow has what
// the repository's settings give. Only posting and booking write.
func checkPermissions(t *testing.T, path string, n yaml.Node) (granted map[string]string) {
	t.Helper()
	require.Equal(t, yaml.MappingNode, n.Kind, "%s: no permissions at the top, or all", path)
	require.NoError(t, n.Decode(&granted))
	posts := map[string]bool{"checks": true, "pull-requests": true, "statuses": true, "contents": strings.Contains(text(t, path), "book: ")}
	for what, level := range granted {
		assert.True(t, level == "read" || level == "write" && posts[what] && strings.Contains(path, "examples"), "%s: %s: %s", path, what, level)
	}
	return granted
}

func TestActionlint(t *testing.T) {
	if testing.Short() {
		t.Skip("it needs actionlint")
	}
	out, err := exec.Command(tool(t, "actionlint"), append([]string{"-no-color", "-shellcheck", tool(t, "shellcheck")}, workflows(t)...)...).CombinedOutput()
	assert.NoError(t, err, "%s", out)
}

func TestShellcheck(t *testing.T) {
	if testing.Short() {
		t.Skip("it needs shellcheck")
	}
	out, err := exec.Command(tool(t, "shellcheck"), scripts(t)...).CombinedOutput()
	assert.NoError(t, err, "%s", out)
}
