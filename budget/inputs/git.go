package inputs

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"strings"
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

// run runs git on the clone. Its exit with a complaint wraps ErrUnknown.
func (g *Git) run(ctx context.Context, args ...string) ([]byte, error) {
	// A clone may belong to another user (containers): what is asked only reads.
	args = append([]string{"-c", "safe.directory=*", "-c", "core.quotePath=false"}, args...)
	cmd := exec.CommandContext(ctx, "git", args...)
	cmd.Dir = g.Dir
	cmd.Env = append(os.Environ(), "LC_ALL=C", "GIT_TERMINAL_PROMPT=0", "GIT_NO_LAZY_FETCH=1")
	var complaint bytes.Buffer
	cmd.Stderr = &complaint
	out, err := cmd.Output()
	var exit *exec.ExitError
	if errors.As(err, &exit) {
		return nil, fmt.Errorf("git: %s: %w", strings.TrimSpace(complaint.String()), ErrUnknown)
	}
	return out, err
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

// MergeBase is the best common ancestor. A shallow clone is not asked: it may
// know a common ancestor and not the best one.
func (g *Git) MergeBase(ctx context.Context, a, b string) (string, error) {
	if err := errors.Join(plain(a), plain(b)); err != nil {
		return "", err
	}
	if shallow, err := g.run(ctx, "rev-parse", "--is-shallow-repository"); err != nil || strings.TrimSpace(string(shallow)) != "false" {
		return "", fmt.Errorf("merge base of %s and %s: the clone is shallow: %w", a, b, ErrUnknown)
	}
	out, err := g.run(ctx, "merge-base", a, b)
	if err != nil {
		return "", fmt.Errorf("merge base of %s and %s: %w", a, b, err)
	}
	return strings.TrimSpace(string(out)), nil
}

// Tip is the commit of a branch as the remote has it, else of the local one.
func (g *Git) Tip(ctx context.Context, branch string) (string, error) {
	if err := plain(branch); err != nil {
		return "", err
	}
	for _, ref := range []string{"refs/remotes/origin/", "refs/heads/"} {
		out, err := g.run(ctx, "rev-parse", "--verify", "--quiet", ref+branch+"^{commit}")
		if err == nil {
			return strings.TrimSpace(string(out)), nil
		}
	}
	return "", fmt.Errorf("branch %s: %w", branch, ErrUnknown)
}
