package apitest

import (
	"maps"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"
)

// Repo is a git repository that a test makes, with a work tree and one branch,
// main, without commits.
type Repo struct {
	Dir string
	t   testing.TB
	at  int // commits so far: their clock
}

// NewRepo makes a repository that ends with the test.
func NewRepo(t testing.TB) *Repo {
	t.Helper()
	r := &Repo{Dir: t.TempDir(), t: t}
	r.Git("init", "--quiet", "--initial-branch=main")
	return r
}

// Git runs git in the repository. A failure ends the test.
func (r *Repo) Git(args ...string) string {
	r.t.Helper()
	cmd := exec.Command("git", args...)
	cmd.Dir = r.Dir
	// Nobody's configuration, and a clock of its own: the same commits have the
	// same ids on every machine.
	when := time.Date(2031, 3, 1, 0, r.at, 0, 0, time.UTC).Format(time.RFC3339)
	cmd.Env = append(os.Environ(), "LC_ALL=C", "GIT_CONFIG_GLOBAL="+os.DevNull, "GIT_CONFIG_SYSTEM="+os.DevNull,
		"GIT_AUTHOR_NAME=keeper", "GIT_AUTHOR_EMAIL=keeper@harbour.example", "GIT_COMMITTER_NAME=keeper", "GIT_COMMITTER_EMAIL=keeper@harbour.example",
		"GIT_AUTHOR_DATE="+when, "GIT_COMMITTER_DATE="+when)
	out, err := cmd.CombinedOutput()
	if err != nil {
		r.t.Fatalf("git %s: %v\n%s", strings.Join(args, " "), err, out)
	}
	return strings.TrimSpace(string(out))
}

// Commit writes files and commits them on the branch that is checked out. An
// empty content removes the file. It returns the commit's id.
func (r *Repo) Commit(message string, files map[string]string) string {
	r.t.Helper()
	for _, name := range slices.Sorted(maps.Keys(files)) {
		r.write(filepath.Join(r.Dir, filepath.FromSlash(name)), files[name])
	}
	r.at++
	r.Git("add", "--all")
	r.Git("commit", "--quiet", "--allow-empty", "--message", message)
	return r.Git("rev-parse", "HEAD")
}

func (r *Repo) write(path, content string) {
	r.t.Helper()
	var err error
	if content == "" {
		err = os.Remove(path)
	} else if err = os.MkdirAll(filepath.Dir(path), 0o777); err == nil {
		err = os.WriteFile(path, []byte(content), 0o666)
	}
	if err != nil {
		r.t.Fatal(err)
	}
}

// Branch checks out a new branch at a commit.
func (r *Repo) Branch(name, at string) {
	r.t.Helper()
	r.Git("checkout", "--quiet", "-b", name, at)
}

// Checkout checks out a branch that is there.
func (r *Repo) Checkout(name string) {
	r.t.Helper()
	r.Git("checkout", "--quiet", name)
}

// Merge merges a branch into the one that is checked out, with a merge commit.
func (r *Repo) Merge(name string) string {
	r.t.Helper()
	r.at++
	r.Git("merge", "--quiet", "--no-ff", "--message", "merge "+name, name)
	return r.Git("rev-parse", "HEAD")
}
