package ledger

import (
	"bufio"
	"bytes"
	"context"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
)

// tip is the newest commit of the ledger's branch, and what of its files was
// loaded.
type tip struct {
	repo  *repo
	head  string // empty: there is no such branch yet
	files []treeFile
	text  map[string][]byte // by name
	cat   *catFile
}

// treeFile is a file of a tree, or a folder.
type treeFile struct{ mode, id, name string }

// fetch brings the newest commit and its list of files. Where the last state is
// at hand, what changed since comes with it; else files come when they are
// asked for.
func (r *repo) fetch(ctx context.Context) (*tip, error) {
	t := &tip{repo: r, text: map[string][]byte{}}
	if r.own {
		err := r.fetchTip(ctx)
		var said *complaint
		if errors.As(err, &said) && strings.Contains(said.text, "couldn't find remote ref") {
			return t, nil
		}
		if err != nil {
			return nil, err
		}
	}
	var err error
	if t.cat, err = r.catFile(ctx); err != nil {
		return nil, err
	}
	if err := t.list(); err != nil {
		t.close()
		return nil, err
	}
	return t, nil
}

func (r *repo) fetchTip(ctx context.Context) error {
	args := []string{"fetch", "--quiet", "--no-tags", "--no-write-fetch-head", "--no-recurse-submodules"}
	_, err := os.Stat(filepath.Join(r.dir, filepath.FromSlash(r.store.ref)))
	switch {
	case r.full:
		args = append(args, "--no-filter", "--update-shallow")
	case err == nil:
		args = append(args, "--no-filter", "--depth=1")
	default:
		args = append(args, "--filter=blob:none", "--depth=1")
	}
	_, err = r.run(ctx, nil, append(args, ours, "+refs/heads/"+r.store.branch+":"+r.store.ref)...)
	return err
}

// list reads which files the commit has.
func (t *tip) list() error {
	id, text, err := t.cat.get(t.repo.store.ref)
	if err != nil || id == "" {
		return err
	}
	t.head = id
	t.files, err = t.cat.tree(treeOf(text))
	return err
}

// treeOf is the tree that the text of a commit names on its first line.
func treeOf(commit []byte) string {
	first, _, _ := strings.Cut(string(commit), "\n")
	return strings.TrimPrefix(first, "tree ")
}

// tree reads the files of a tree.
func (c *catFile) tree(id string) (files []treeFile, err error) {
	_, text, err := c.get(id)
	if err != nil {
		return nil, err
	}
	size := len(id) / 2
	for len(text) > 0 {
		about, rest, ok := bytes.Cut(text, []byte{0})
		mode, name, named := strings.Cut(string(about), " ")
		if !ok || !named || len(rest) < size {
			return nil, fmt.Errorf("tree %s of the ledger cannot be read", id)
		}
		files = append(files, treeFile{mode, hex.EncodeToString(rest[:size]), name})
		text = rest[size:]
	}
	return files, nil
}

// load loads files, those that are not at hand with one request.
func (t *tip) load(ctx context.Context, names []string) error {
	missing, err := t.take(names)
	if err != nil || len(missing) == 0 {
		return err
	}
	args := []string{"-c", "fetch.negotiationAlgorithm=noop", "fetch", "--quiet", "--no-tags", "--no-write-fetch-head", "--no-recurse-submodules", "--filter=blob:none", ours}
	for _, name := range missing {
		args = append(args, t.id(name))
	}
	if _, err := t.repo.run(ctx, nil, args...); err != nil {
		return err
	}
	if missing, err = t.take(missing); err == nil && len(missing) > 0 {
		err = fmt.Errorf("file %s of the ledger's branch is missing from the repository", missing[0])
	}
	return err
}

// take takes files that are at hand and tells which are not.
func (t *tip) take(names []string) (missing []string, err error) {
	for _, name := range names {
		id, text, err := t.cat.get(t.id(name))
		if err != nil {
			return nil, err
		}
		if id == "" {
			missing = append(missing, name)
			continue
		}
		t.text[name] = text
	}
	return missing, nil
}

// id is the name of a file's content.
func (t *tip) id(name string) string {
	for _, f := range t.files {
		if f.name == name {
			return f.id
		}
	}
	return ""
}

func (t *tip) close() {
	if t.cat != nil {
		t.cat.close()
	}
}

// catFile is a git that is asked for objects, one after the other.
type catFile struct {
	cmd *exec.Cmd
	in  io.WriteCloser
	out *bufio.Reader
}

func (r *repo) catFile(ctx context.Context) (*catFile, error) {
	c := &catFile{cmd: r.command(ctx, "cat-file", "--batch")}
	var err error
	if c.in, err = c.cmd.StdinPipe(); err != nil {
		return nil, err
	}
	out, err := c.cmd.StdoutPipe()
	if err != nil {
		return nil, err
	}
	c.out = bufio.NewReader(out)
	if err := c.cmd.Start(); err != nil {
		return nil, fmt.Errorf("run git: %w; the ledger needs git 2.31 or newer", err)
	}
	return c, nil
}

// get gives an object; its id is empty if it is not there.
func (c *catFile) get(name string) (id string, text []byte, err error) {
	if _, err := io.WriteString(c.in, name+"\n"); err != nil {
		return "", nil, fmt.Errorf("git cat-file: %w", err)
	}
	about, err := c.out.ReadString('\n')
	if err != nil {
		return "", nil, fmt.Errorf("git cat-file: %w", err)
	}
	fields := strings.Fields(about)
	if len(fields) == 2 && fields[1] == "missing" {
		return "", nil, nil
	}
	if len(fields) != 3 {
		return "", nil, fmt.Errorf("git cat-file: %s", strings.TrimSpace(about))
	}
	size, err := strconv.Atoi(fields[2])
	if err != nil {
		return "", nil, fmt.Errorf("git cat-file: %w", err)
	}
	text = make([]byte, size+1) // and a newline
	if _, err := io.ReadFull(c.out, text); err != nil {
		return "", nil, fmt.Errorf("git cat-file: %w", err)
	}
	return fields[0], text[:size], nil
}

func (c *catFile) close() {
	_ = c.in.Close()
	_ = c.cmd.Wait()
}
