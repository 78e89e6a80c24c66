package ledger

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"maps"
	"slices"
	"strings"
)

// errLate tells that another booking came first.
var errLate = errors.New("another booking came first")

// commit appends what is new on the pages, commits it on the tip and pushes it.
func (t *tip) commit(ctx context.Context, pages map[string]*page) error {
	files, entered := slices.Clone(t.files), 0
	for _, name := range slices.Sorted(maps.Keys(pages)) {
		p := pages[name]
		if len(p.lines) == 0 {
			continue
		}
		entered += len(p.lines)
		text := t.text[name]
		if len(text) > 0 && text[len(text)-1] != '\n' {
			text = append(text, '\n')
		}
		id, err := t.repo.id(ctx, append(text, p.text()...), "hash-object", "-w", "--stdin", "--no-filters")
		if err != nil {
			return err
		}
		files = replace(files, treeFile{"100644", id, name})
	}
	if entered == 0 {
		return nil
	}
	tree, err := t.repo.id(ctx, listing(files), "mktree", "--missing", "-z")
	if err != nil {
		return err
	}
	args := []string{"commit-tree", tree, "-m", fmt.Sprintf("Book %d lines", entered)}
	if t.head != "" {
		args = append(args, "-p", t.head)
	}
	commit, err := t.repo.id(ctx, nil, args...)
	if err != nil {
		return err
	}
	if t.repo.store.remote == "" {
		return t.move(ctx, commit)
	}
	return t.push(ctx, commit)
}

// replace puts a file in the place of the one of its name.
func replace(files []treeFile, f treeFile) []treeFile {
	for n := range files {
		if files[n].name == f.name {
			files[n].id = f.id
			return files
		}
	}
	return append(files, f)
}

// listing is a tree as mktree reads it.
func listing(files []treeFile) []byte {
	var b bytes.Buffer
	for _, f := range files {
		kind := "blob"
		switch strings.TrimLeft(f.mode, "0") {
		case "40000":
			kind = "tree"
		case "160000":
			kind = "commit"
		}
		fmt.Fprintf(&b, "%s %s %s\t%s\x00", f.mode, kind, f.id, f.name)
	}
	return b.Bytes()
}

// push hands the commit over. The server takes it only if the branch still is
// where it was fetched: whoever comes second is rejected.
func (t *tip) push(ctx context.Context, commit string) error {
	r := t.repo
	_, err := r.run(ctx, nil, "push", "--quiet", "--porcelain", "--no-verify", "--no-follow-tags", "--no-signed", "--recurse-submodules=no",
		ours, commit+":refs/heads/"+r.store.branch)
	var said *complaint
	if errors.As(err, &said) && (tooLate(said.out+said.text) || unseen(said.text)) {
		return errLate
	}
	return err
}

// unseen tells that git met a commit that the server has and we do not, and may
// not fetch: somebody pushed since we looked.
func unseen(said string) bool { return strings.Contains(said, "from promisor remote") }

// move moves the clone's own branch, if it still is where it was.
func (t *tip) move(ctx context.Context, commit string) error {
	was := t.head
	if was == "" {
		was = strings.Repeat("0", len(commit))
	}
	_, err := t.repo.run(ctx, nil, "update-ref", "--no-deref", "-m", "budgetcheck: book", t.repo.store.ref, commit, was)
	var said *complaint
	if errors.As(err, &said) && tooLate(said.text) {
		return errLate
	}
	return err
}

// tooLate tells whether git or the server rejected what came second.
func tooLate(said string) bool {
	return slices.ContainsFunc([]string{"fetch first", "non-fast-forward", "stale info", "cannot lock ref", "failed to update ref", "incorrect old value",
		"reference already exists", "failed to lock", "fast-forward"}, func(words string) bool { return strings.Contains(said, words) })
}
