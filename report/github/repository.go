package github

import (
	"context"
	"errors"
	"fmt"
	"net/http"
	"slices"

	"github.com/google/go-github/v60/github"

	"budgetcheck/budget/inputs"
)

// Repository reads commits through the API, for clones that do not have them.
// It keeps its answers, so that nothing is asked twice; a branch keeps the tip
// that it had when first asked for. Make one and use it throughout.
func (h *Host) Repository() inputs.Repository {
	return &repository{host: h, most: maxBlob}
}

type repository struct {
	host  *Host
	most  int               // size of the largest file that is read, in bytes
	trees memo[inputs.Tree] // by id of the commit or tree
	blobs memo[[]byte]      // by id
	bases memo[string]      // by both commits
	tips  memo[string]      // by branch
}

// Tree lists the files of a commit as git does: submodules are listed, folders
// are not.
func (r *repository) Tree(ctx context.Context, commit string) (inputs.Tree, error) {
	if err := plainID(commit); err != nil {
		return nil, err
	}
	t, err := r.below(ctx, commit)
	if err != nil {
		return nil, fmt.Errorf("files of commit %s: %w", commit, err)
	}
	return slices.Clone(t), nil
}

// below lists all files below a commit or tree. Its paths start there.
func (r *repository) below(ctx context.Context, id string) (inputs.Tree, error) {
	return r.trees.get(id, func() (inputs.Tree, error) {
		all, _, err := r.host.client.Git.GetTree(ctx, r.host.owner, r.host.repo, id, true)
		if err != nil {
			return nil, unknown(err)
		}
		if all.GetTruncated() {
			return r.walk(ctx, id)
		}
		var files inputs.Tree
		for _, e := range all.Entries {
			if e.GetType() != "tree" {
				files = append(files, file(e))
			}
		}
		return files, whole(files)
	})
}

// walk lists a tree that is too large for one answer, folder by folder. Folders
// that two commits share are asked for once.
func (r *repository) walk(ctx context.Context, id string) (inputs.Tree, error) {
	level, _, err := r.host.client.Git.GetTree(ctx, r.host.owner, r.host.repo, id, false)
	if err != nil {
		return nil, unknown(err)
	}
	if level.GetTruncated() {
		return nil, fmt.Errorf("tree %s has too many entries for the API, it lists only a part; judge in a job with a full clone", id)
	}
	var files inputs.Tree
	for _, e := range level.Entries {
		if e.GetType() != "tree" {
			files = append(files, file(e))
			continue
		}
		folder := file(e)
		if err := plainID(folder.Blob); err != nil {
			return nil, fmt.Errorf("%s: %w", folder.Path, err)
		}
		below, err := r.below(ctx, folder.Blob)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", folder.Path, err)
		}
		for _, f := range below {
			f.Path = folder.Path + "/" + f.Path
			files = append(files, f)
		}
	}
	return files, whole(files)
}

func file(e *github.TreeEntry) inputs.File {
	return inputs.File{Mode: e.GetMode(), Path: e.GetPath(), Blob: e.GetSHA()}
}

// whole refuses entries with something missing: they would hash as others do.
func whole(files inputs.Tree) error {
	for _, f := range files {
		if f.Mode == "" || f.Path == "" || f.Blob == "" {
			return fmt.Errorf("the host lists a file without its mode, path or id (%q, %q, %q)", f.Mode, f.Path, f.Blob)
		}
	}
	return nil
}

// Meet tells where head left a branch. A name that is the full id of a commit
// is taken for one. The tip of a branch is asked for by its ref: where hosts
// compare by name, a tag of the same name could stand in for the branch.
func (r *repository) Meet(ctx context.Context, ref, head string) (tip, base string, err error) {
	if err := plainID(head); err != nil {
		return "", "", err
	}
	tip = ref
	if !isCommit(ref) {
		tip, err = r.tips.get(ref, func() (string, error) { return r.host.tip(ctx, "heads/"+ref) })
	}
	if err != nil || tip == head {
		return tip, tip, err
	}
	base, err = r.bases.get(tip+"..."+head, func() (string, error) { return r.host.mergeBase(ctx, tip, head) })
	if err != nil {
		return "", "", fmt.Errorf("where %s left %s: %w", head, ref, err)
	}
	return tip, base, nil
}

// mergeBase asks for the second page: the first one comes with the patches of
// up to 300 files.
func (h *Host) mergeBase(ctx context.Context, a, b string) (string, error) {
	got, _, err := h.client.Repositories.CompareCommits(ctx, h.owner, h.repo, a, b, &github.ListOptions{Page: 2, PerPage: 1})
	if err != nil {
		return "", unknown(err)
	}
	var c checker
	return c.commit("merge_base_commit.sha", got.GetMergeBaseCommit().GetSHA()), c.err
}

// tip is the commit of a branch.
func (h *Host) tip(ctx context.Context, ref string) (string, error) {
	o, err := h.object(ctx, ref)
	if err != nil {
		return "", err
	}
	var c checker
	return c.commit("the commit of "+ref, o.GetSHA()), c.err
}

// object is what a ref points to: a commit, or the object of an annotated tag.
func (h *Host) object(ctx context.Context, ref string) (*github.GitObject, error) {
	if wrong := wrongName(ref); wrong != "" {
		return nil, fmt.Errorf("%s is no branch or tag, %s: %w", shown(ref), wrong, inputs.ErrUnknown)
	}
	got, _, err := h.client.Git.GetRef(ctx, h.owner, h.repo, ref)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", ref, unknown(err))
	}
	// Some hosts answer with a longer name that begins like it.
	if got.GetRef() != "refs/"+ref {
		return nil, fmt.Errorf("%s: the host answers with %s: %w", ref, shown(got.GetRef()), inputs.ErrUnknown)
	}
	return got.GetObject(), nil
}

// plainID refuses what is not a full id. It also keeps names out of addresses.
func plainID(id string) error {
	if !isCommit(id) {
		return fmt.Errorf("%s is not a full id (40 or 64 hexadecimal digits): %w", shown(id), inputs.ErrUnknown)
	}
	return nil
}

// unknown marks answers which say that the host does not have what was asked
// for, or does not show it to the token: it does not tell these apart.
func unknown(err error) error {
	var answer *github.ErrorResponse
	if !errors.As(err, &answer) || answer.Response == nil {
		return err
	}
	switch answer.Response.StatusCode {
	case http.StatusNotFound, http.StatusConflict, http.StatusUnprocessableEntity:
		return fmt.Errorf("%w, or not shown to the token: %w", inputs.ErrUnknown, err)
	}
	return err
}
