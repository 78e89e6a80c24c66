package inputs

import (
	"bytes"
	"cmp"
	"context"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"slices"
	"strconv"
	"strings"
	"time"

	"github.com/bmatcuk/doublestar/v4"

	"budgetcheck/budget/unit"
)

// Git is a local clone, read by the system's git. It may be shallow or bare.
type Git struct {
	Dir string
}

// OpenGit finds the clone that dir is in.
func OpenGit(ctx context.Context, dir string) (*Git, error) {
	g := &Git{Dir: dir}
	_, err := g.run(ctx, "rev-parse", "--git-dir")
	return g, err
}

// Prefix is where dir lies in the work tree, with slashes; empty at its root.
func (g *Git) Prefix(ctx context.Context) (string, error) {
	out, err := g.run(ctx, "rev-parse", "--show-prefix")
	return strings.TrimSuffix(strings.TrimSpace(string(out)), "/"), err
}

// run runs git on the clone. Its exit with a complaint wraps ErrUnknown.
func (g *Git) run(ctx context.Context, args ...string) ([]byte, error) {
	// A clone may belong to another user (containers): what is asked only reads.
	args = append([]string{"-c", "safe.directory=*", "-c", "core.quotePath=false"}, args...)
	cmd := exec.CommandContext(ctx, "git", args...)
	cmd.Dir = g.Dir
	// Code that ran in the clone may have left replacements and grafts, by which
	// git would show another commit than the one that was asked for.
	cmd.Env = append(withoutInputs(os.Environ()), "LC_ALL=C", "GIT_TERMINAL_PROMPT=0", "GIT_NO_LAZY_FETCH=1",
		"GIT_NO_REPLACE_OBJECTS=1", "GIT_GRAFT_FILE="+os.DevNull)
	var complaint bytes.Buffer
	cmd.Stderr = &complaint
	out, err := cmd.Output()
	var exit *exec.ExitError
	if errors.As(err, &exit) {
		return nil, fmt.Errorf("git: %s: %w", strings.TrimSpace(complaint.String()), ErrUnknown)
	}
	return out, err
}

// withoutInputs is the environment without the inputs of the action: git needs
// no token for what is asked here.
func withoutInputs(env []string) []string {
	return slices.DeleteFunc(env, func(v string) bool { return strings.HasPrefix(v, "INPUT_") })
}

// plain refuses names that git could take for an option or an expression.
func plain(name string) error {
	if name == "" || strings.HasPrefix(name, "-") || strings.ContainsAny(name, " \t\n\x00^~:?*[\\") || strings.Contains(name, "..") || strings.Contains(name, "@{") {
		return fmt.Errorf("%q is not a plain name: %w", name, ErrUnknown)
	}
	return nil
}

// Tree lists the files of a commit.
func (g *Git) Tree(ctx context.Context, commit string) (Tree, error) {
	if err := plain(commit); err != nil {
		return nil, err
	}
	out, err := g.run(ctx, "ls-tree", "-r", "-z", "--full-tree", commit)
	if err != nil {
		return nil, fmt.Errorf("commit %s: %w", commit, err)
	}
	var t Tree
	for entry := range strings.SplitSeq(strings.TrimSuffix(string(out), "\x00"), "\x00") {
		about, path, ok := strings.Cut(entry, "\t")
		fields := strings.Fields(about)
		if !ok || len(fields) != 3 {
			continue // an empty tree
		}
		t = append(t, File{Mode: fields[0], Path: path, Blob: fields[2]})
	}
	return t, nil
}

// Blob reads a file's content.
func (g *Git) Blob(ctx context.Context, f File) ([]byte, error) {
	if err := plain(f.Blob); err != nil {
		return nil, err
	}
	out, err := g.run(ctx, "cat-file", "blob", f.Blob)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", f.Path, err)
	}
	return out, nil
}

// Meet tells where head left a branch. A shallow clone is not asked: it may
// know a common ancestor and not the best one.
func (g *Git) Meet(ctx context.Context, ref, head string) (tip, base string, err error) {
	if shallow, err := g.run(ctx, "rev-parse", "--is-shallow-repository"); err != nil || strings.TrimSpace(string(shallow)) != "false" {
		return "", "", fmt.Errorf("where %s left %s: the clone is shallow: %w", head, ref, ErrUnknown)
	}
	if tip, err = g.tip(ctx, ref); err != nil {
		return "", "", err
	}
	if err := plain(head); err != nil {
		return "", "", err
	}
	out, err := g.run(ctx, "merge-base", tip, head)
	if err != nil {
		return "", "", fmt.Errorf("where %s left %s: %w", head, ref, err)
	}
	return tip, strings.TrimSpace(string(out)), nil
}

// tip is the commit of a branch as the remote has it, else of the local one,
// else the commit that the name itself is.
func (g *Git) tip(ctx context.Context, ref string) (string, error) {
	if err := plain(ref); err != nil {
		return "", err
	}
	candidates := []string{"refs/remotes/origin/" + ref, "refs/heads/" + ref}
	if FullID(ref) { // any other bare name could be a tag that is called like the branch
		candidates = []string{ref}
	}
	for _, name := range candidates {
		if out, err := g.run(ctx, "rev-parse", "--verify", "--quiet", name+"^{commit}"); err == nil {
			return strings.TrimSpace(string(out)), nil
		}
	}
	return "", fmt.Errorf("branch %s: %w", ref, ErrUnknown)
}

// Tag is a tag of a repository.
type Tag struct {
	Name   string
	Commit string // full id
	At     unit.Instant
}

// Tags are the tags that a glob matches on commits that a commit or branch
// contains, in order of time: that of the tag, or of its commit if the tag has
// none of its own.
func (g *Git) Tags(ctx context.Context, glob, in string) (tags []Tag, err error) {
	commit, err := g.tip(ctx, in)
	if err != nil {
		return nil, err
	}
	out, err := g.run(ctx, "for-each-ref", "--merged", commit, "--sort=creatordate",
		"--format=%(refname:strip=2)%09%(objectname)%09%(*objectname)%09%(creatordate:unix)", "refs/tags")
	if err != nil {
		return nil, err
	}
	for line := range strings.Lines(string(out)) {
		fields := strings.Split(strings.TrimSpace(line), "\t")
		if len(fields) != 4 || !doublestar.MatchUnvalidated(glob, fields[0]) {
			continue
		}
		seconds, err := strconv.ParseInt(fields[3], 10, 64)
		if err != nil {
			return nil, fmt.Errorf("git tells the time of tag %s as %q", fields[0], fields[3])
		}
		tags = append(tags, Tag{Name: fields[0], Commit: cmp.Or(fields[2], fields[1]), At: unit.At(time.Unix(seconds, 0))})
	}
	return tags, nil
}
