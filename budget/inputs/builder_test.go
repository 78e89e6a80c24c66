package inputs_test

import (
	"context"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"

	"budgetcheck/budget/inputs"
)

// ctx is for calls that need not be broken off.
var ctx = context.Background()

// repo is a real repository in a folder of its own.
type repo struct {
	t   *testing.T
	dir string
}

func newRepo(t *testing.T, args ...string) *repo {
	t.Helper()
	r := &repo{t, t.TempDir()}
	r.run(append([]string{"init", "--quiet", "--initial-branch=main"}, args...)...)
	return r
}

// run runs git, with nobody's configuration.
func (r *repo) run(args ...string) string {
	r.t.Helper()
	cmd := exec.Command("git", args...)
	cmd.Dir = r.dir
	cmd.Env = append(os.Environ(), "GIT_CONFIG_GLOBAL="+os.DevNull, "GIT_CONFIG_SYSTEM="+os.DevNull, "GIT_AUTHOR_NAME=keeper", "GIT_AUTHOR_EMAIL=keeper@harbour.example",
		"GIT_COMMITTER_NAME=keeper", "GIT_COMMITTER_EMAIL=keeper@harbour.example")
	out, err := cmd.CombinedOutput()
	require.NoError(r.t, err, "git %v: %s", args, out)
	return strings.TrimSpace(string(out))
}

// commit writes pairs of file and content, and commits them.
func (r *repo) commit(pairs ...string) string {
	r.t.Helper()
	for n := 0; n < len(pairs); n += 2 {
		path := filepath.Join(r.dir, filepath.FromSlash(pairs[n]))
		require.NoError(r.t, os.MkdirAll(filepath.Dir(path), 0o777))
		require.NoError(r.t, os.WriteFile(path, []byte(pairs[n+1]), 0o666))
	}
	r.run("add", "--all")
	r.run("commit", "--quiet", "--allow-empty", "--message", "step")
	return r.run("rev-parse", "HEAD")
}

// clone clones the repository, with further arguments of git clone.
func (r *repo) clone(args ...string) *repo {
	r.t.Helper()
	c := &repo{r.t, filepath.Join(r.t.TempDir(), "a clone")}
	r.run(append([]string{"clone", "--quiet", "file://" + filepath.ToSlash(r.dir), c.dir}, args...)...)
	return c
}

func (r *repo) open() *inputs.Git {
	r.t.Helper()
	g, err := inputs.OpenGit(ctx, r.dir)
	require.NoError(r.t, err)
	return g
}

func (r *repo) tree(commit string) inputs.Tree {
	r.t.Helper()
	t, err := r.open().Tree(ctx, commit)
	require.NoError(r.t, err)
	return t
}

func paths(t inputs.Tree) (list []string) {
	for _, f := range t {
		list = append(list, f.Path)
	}
	return list
}
