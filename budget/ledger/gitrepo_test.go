package ledger

import (
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"
)

// folder is a real repository, or a folder for one.
type folder struct {
	t   testing.TB
	dir string
}

// git runs git, with nobody's configuration.
func (r folder) git(args ...string) string {
	r.t.Helper()
	cmd := exec.Command("git", args...)
	cmd.Dir = r.dir
	cmd.Env = append(os.Environ(), "GIT_CONFIG_GLOBAL="+os.DevNull, "GIT_CONFIG_SYSTEM="+os.DevNull, "GIT_AUTHOR_NAME=keeper", "GIT_AUTHOR_EMAIL=keeper@harbour.example",
		"GIT_COMMITTER_NAME=keeper", "GIT_COMMITTER_EMAIL=keeper@harbour.example")
	out, err := cmd.CombinedOutput()
	require.NoError(r.t, err, "git %v: %s", args, out)
	return strings.TrimSpace(string(out))
}

// newServer is an empty bare repository that can leave files out when it is
// fetched from, as code hosts can.
func newServer(t testing.TB) folder {
	t.Helper()
	r := folder{t, t.TempDir()}
	r.git("init", "--quiet", "--bare", "--initial-branch=main")
	r.git("config", "uploadpack.allowFilter", "true")
	r.git("config", "uploadpack.allowAnySHA1InWant", "true")
	return r
}

func (r folder) url() string { return "file://" + filepath.ToSlash(r.dir) }

// newClone is a repository with one commit on main.
func newClone(t testing.TB) folder {
	t.Helper()
	r := folder{t, t.TempDir()}
	r.git("init", "--quiet", "--initial-branch=main")
	require.NoError(t, os.WriteFile(filepath.Join(r.dir, "train.py"), []byte("steps = 1\n"), 0o666))
	r.git("add", "--all")
	r.git("commit", "--quiet", "--message", "step")
	return r
}

// cached keeps repositories of our own in a folder of the test.
func cached(t testing.TB) string {
	t.Helper()
	dir := t.TempDir()
	t.Setenv("XDG_CACHE_HOME", dir) // Linux
	t.Setenv("HOME", dir)           // macOS, and nobody's settings
	t.Setenv("LocalAppData", dir)   // Windows
	return dir
}

// openGitAt opens a ledger as it is seen from a folder.
func openGitAt(t testing.TB, dir, where string) *gitStore {
	t.Helper()
	s, err := openGitIn(ctx, dir, where)
	require.NoError(t, err)
	return s
}

// slow leaves a test out of the quick loop: each booking starts about fifteen
// processes.
func slow(t *testing.T) {
	t.Helper()
	if testing.Short() {
		t.Skip("not in the quick loop")
	}
}
