package budget_test

import (
	"context"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/inputs"
)

// history is a real repository: what git makes of merges decides these cases.
type history struct {
	t   *testing.T
	git *inputs.Git
}

func newHistory(t *testing.T) *history {
	h := &history{t: t, git: &inputs.Git{Dir: t.TempDir()}}
	h.run("init", "--quiet", "--initial-branch=main")
	return h
}

func (h *history) run(args ...string) string {
	h.t.Helper()
	cmd := exec.Command("git", args...)
	cmd.Dir = h.git.Dir
	cmd.Env = append(os.Environ(), "GIT_CONFIG_GLOBAL="+os.DevNull, "GIT_CONFIG_SYSTEM="+os.DevNull, "GIT_AUTHOR_NAME=keeper", "GIT_AUTHOR_EMAIL=keeper@harbour.example",
		"GIT_COMMITTER_NAME=keeper", "GIT_COMMITTER_EMAIL=keeper@harbour.example")
	out, err := cmd.CombinedOutput()
	require.NoError(h.t, err, "git %v: %s", args, out)
	return strings.TrimSpace(string(out))
}

// commit writes pairs of file and content, and commits them.
func (h *history) commit(pairs ...string) string {
	h.t.Helper()
	for n := 0; n < len(pairs); n += 2 {
		path := filepath.Join(h.git.Dir, pairs[n])
		require.NoError(h.t, os.MkdirAll(filepath.Dir(path), 0o777))
		require.NoError(h.t, os.WriteFile(path, []byte(pairs[n+1]), 0o666))
	}
	return h.committed("add", "--all")
}

// committed runs git, commits what that left in the index, and names it.
func (h *history) committed(args ...string) string {
	h.t.Helper()
	h.run(args...)
	h.run("commit", "--quiet", "--allow-empty", "--message", "step")
	return h.run("rev-parse", "HEAD")
}

func (h *history) tree(commit string) inputs.Tree {
	h.t.Helper()
	t, err := h.git.Tree(context.Background(), commit)
	require.NoError(h.t, err)
	return t
}

// started is a history with one commit of two jobs, a policy and its series.
func started(t *testing.T) (h *history, base string) {
	h = newHistory(t)
	return h, h.commit("budgetcheck.toml", "format = 1\n", "grid/march.csv", steady, "tide/train.py", "epochs = 10\n", "score/score.py", "x = 1\n", "docs/tides.md", "Tides.\n")
}

// paths is plain with the files that each of two jobs depends on.
var paths = strings.Replace(plain, "required = true\n", "required = true\npaths = [\"tide/**\"]\n", 1) + `
[[job]]
name = "score-tide"
stage = "evaluation"
required = true
paths = ["score/**"]

[[budget]]
name = "one scoring"
branch = "main"
job = "score-tide"
limit = "150 g"
per = "run"
`

// change is a scene about a head commit and where it left its target.
func (h *history) change(policy, head, base string, named []string, runs ...sketch) *scene {
	s := sceneOf(runs...)
	s.policy, s.about.HeadCommit = policy, head
	s.about.Commits = &budget.Commits{Head: h.tree(head), Named: map[string]inputs.Tree{}}
	if base != "" {
		s.about.Commits.Base = h.tree(base)
	}
	for _, commit := range named {
		s.about.Commits.Named[commit] = h.tree(commit)
	}
	return s
}

// of says on which commit a run ran.
func of(commit string) func(*sketch) { return func(s *sketch) { s.open.Commit = commit } }

// scored is a run of the second job, on a machine of its own.
func scored(s *sketch) {
	s.file, s.open.Run, s.open.Job, s.open.Stage, s.open.Host = "score.ndjson", "s1", "score-tide", "evaluation", "mole-2"
}
