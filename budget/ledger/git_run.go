package ledger

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"slices"
	"strconv"
	"strings"
	"time"
)

// ours is what our repositories call their remote.
const ours = "ledger"

// repo is a repository that git is run on, or a folder that may be in one.
type repo struct {
	store *gitStore
	dir   string
	own   bool // a bare one of our own, with the branch as it was last seen
	full  bool // fetch the whole history and all files
}

// complaint is what git said when it failed.
type complaint struct {
	command string
	text    string
	do      string // what to do
	out     string // what it printed
}

func (c *complaint) Error() string {
	text := fmt.Sprintf("git %s: %s", c.command, c.text)
	if c.do != "" {
		text += "; " + c.do
	}
	return text
}

// command is git with arguments, in the repository.
func (r *repo) command(ctx context.Context, args ...string) *exec.Cmd {
	common := []string{"-c", "safe.directory=*", "-c", "core.hooksPath=" + os.DevNull, "-c", "gc.auto=0", "-c", "maintenance.auto=false",
		"-c", "fetch.prune=false", "-c", "submodule.recurse=false", "-c", "fetch.writeCommitGraph=false"}
	if r.own { // a cache, which is made again when it is broken
		common = append(common, "-c", "core.fsync=none")
	}
	cmd := exec.CommandContext(ctx, "git", append(common, args...)...)
	cmd.Dir = r.dir
	cmd.Env = slices.Clone(r.store.env)
	if r.own {
		// A relative name stays with the folder when it is moved away.
		cmd.Env = r.configure(append(cmd.Env, "GIT_DIR=."), !r.full && (slices.Contains(args, "fetch") || slices.Contains(args, "push")))
	}
	// Git takes its locks away when it is asked to end, not when it is killed.
	cmd.Cancel = func() error {
		if err := cmd.Process.Signal(os.Interrupt); err != nil {
			return cmd.Process.Kill()
		}
		return nil
	}
	cmd.WaitDelay = 5 * time.Second
	return cmd
}

// configure hands settings over in the environment, where no secret among them
// comes onto a disk or into a list of processes. Only a git that talks to the
// remote knows that it could ask there for what is missing; any other says that
// it is missing, so that all of it is fetched with one request.
func (r *repo) configure(env []string, talks bool) []string {
	set := append(slices.Clone(r.store.set), setting{key: "remote." + ours + ".url", value: r.store.remote},
		setting{key: "remote." + ours + ".fetch", value: "+refs/heads/" + r.store.branch + ":" + r.store.ref})
	if talks {
		set = append(set, setting{key: "remote." + ours + ".promisor", value: "true"}, setting{key: "remote." + ours + ".partialclonefilter", value: "blob:none"})
	}
	n, _ := strconv.Atoi(os.Getenv("GIT_CONFIG_COUNT"))
	for _, s := range set {
		env = append(env, fmt.Sprintf("GIT_CONFIG_KEY_%d=%s", n, s.key), fmt.Sprintf("GIT_CONFIG_VALUE_%d=%s", n, s.value))
		n++
	}
	return append(env, fmt.Sprintf("GIT_CONFIG_COUNT=%d", n))
}

// outside is the environment without what points git at another repository,
// and without the inputs of the action; nothing in it asks questions.
func outside(env []string) []string {
	env = slices.DeleteFunc(slices.Clone(env), func(v string) bool {
		name, _, _ := strings.Cut(v, "=")
		return strings.HasPrefix(name, "INPUT_") || slices.Contains([]string{"GIT_DIR", "GIT_WORK_TREE", "GIT_INDEX_FILE", "GIT_COMMON_DIR",
			"GIT_OBJECT_DIRECTORY", "GIT_ALTERNATE_OBJECT_DIRECTORIES", "GIT_NAMESPACE", "GIT_PREFIX", "GIT_SHALLOW_FILE", "GIT_QUARANTINE_PATH"}, name)
	})
	return append(env, "LC_ALL=C", "GIT_TERMINAL_PROMPT=0", "GCM_INTERACTIVE=never", "SSH_ASKPASS_REQUIRE=never",
		"GIT_NO_REPLACE_OBJECTS=1", "GIT_GRAFT_FILE="+os.DevNull, "GIT_NO_LAZY_FETCH=1")
}

// run runs git and gives what it prints.
func (r *repo) run(ctx context.Context, in []byte, args ...string) ([]byte, error) {
	cmd := r.command(ctx, args...)
	if in != nil {
		cmd.Stdin = bytes.NewReader(in)
	}
	var said bytes.Buffer
	cmd.Stderr = &said
	out, err := cmd.Output()
	if ctx.Err() != nil {
		return nil, fmt.Errorf("git %s was broken off: %w", args[0], ctx.Err())
	}
	if exit := new(exec.ExitError); errors.As(err, &exit) {
		c := &complaint{command: args[0], text: r.store.words(said.String()), out: string(out)}
		c.do = advice(c.text+c.out, r.store)
		if c.text == "" {
			c.text = strings.Join(strings.Fields(c.out), " ")
		}
		return nil, c
	}
	if err != nil {
		return nil, fmt.Errorf("run git: %w; the ledger needs git 2.31 or newer", err)
	}
	return out, nil
}

// id runs git where it prints one object's name.
func (r *repo) id(ctx context.Context, in []byte, args ...string) (string, error) {
	out, err := r.run(ctx, in, args...)
	return strings.TrimSpace(string(out)), err
}

// words is what git said on one line, without hints and secrets.
func (s *gitStore) words(text string) string {
	var kept []string
	for l := range strings.Lines(text) {
		if l = strings.TrimSpace(l); l != "" && !strings.HasPrefix(l, "hint:") {
			kept = append(kept, l)
		}
	}
	text = strings.Join(kept, " / ")
	if secret := password(s.remote); secret != "" {
		text = strings.ReplaceAll(text, secret, "xxxxx")
	}
	return text
}

// advice tells what to do about what git or the server said.
func advice(said string, s *gitStore) string {
	for _, c := range []struct{ words, do string }{
		{"protected branch", "let this identity push to branch " + s.branch + " without a pull request"},
		{"hook declined", "let this identity push to branch " + s.branch + ": a hook or rule of the server keeps it from it"},
		{"read-only", "give it permission to write: a token needs contents: write, a deploy key write access"},
		{"could not read Username", "give git a token or a key: reading needs contents: read, booking contents: write"},
		{"Authentication failed", "check the token: reading needs contents: read, booking contents: write"},
		{"403", "give the token permission: reading needs contents: read, booking contents: write"},
		{"Permission to", "give the token or key permission to write: contents: write"},
		{"ermission denied", "give it permission: reading needs read access to the repository, booking write access"},
		{"unable to create", "give it permission: reading needs read access to the repository, booking write access"},
		{"Host key verification failed", "add the server to known_hosts"},
		{"not found", "check the address; a private repository cannot be found without permission to read it"},
		{"does not appear to be a git repository", "check the address"},
		{"does not exist", "check the address"},
	} {
		if strings.Contains(said, c.words) {
			return c.do
		}
	}
	return ""
}
