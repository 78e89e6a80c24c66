package apitest

import (
	"context"
	"strings"
	"testing"

	"github.com/google/go-github/v60/github"
	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// forked is a repository whose main and topic went apart.
func forked(t *testing.T) (r *Repo, root, main, topic string) {
	r = NewRepo(t)
	root = r.Commit("root", map[string]string{"budgetcheck.toml": "format = 1\n", "tide/model.py": "print(1)\n", "grid/north.csv": strings.Repeat("x", 100)})
	r.Branch("work/topic", "main")
	topic = r.Commit("topic", map[string]string{"tide/model.py": "print(2)\n", "grid/north.csv": "", "new.txt": "new\n"})
	r.Checkout("main")
	return r, root, r.Commit("main", map[string]string{"README.md": "tide\n"}), topic
}

func TestReposAreTheSameEverywhere(t *testing.T) {
	_, a, b, c := forked(t)
	_, d, e, f := forked(t)
	assert.Equal(t, []string{a, b, c}, []string{d, e, f})
}

func TestTreesAndBlobs(t *testing.T) {
	ctx := context.Background()
	r, root, _, _ := forked(t)
	c := client(t, New(t, Options{Git: r.Dir}))
	tree, _, err := c.Git.GetTree(ctx, owner, repo, root, true)
	require.NoError(t, err)
	var paths []string
	for _, e := range tree.Entries {
		paths = append(paths, e.GetType()+" "+e.GetPath())
	}
	assert.Equal(t, []string{"blob budgetcheck.toml", "tree grid", "blob grid/north.csv", "tree tide", "blob tide/model.py"}, paths)
	assert.False(t, tree.GetTruncated())
	assert.Equal(t, r.Git("rev-parse", root+":budgetcheck.toml"), tree.Entries[0].GetSHA())

	blob, _, err := c.Git.GetBlob(ctx, owner, repo, tree.Entries[2].GetSHA())
	require.NoError(t, err)
	assert.Contains(t, blob.GetContent(), "\n", "in lines, as the host sends it")
	raw, _, err := c.Git.GetBlobRaw(ctx, owner, repo, tree.Entries[0].GetSHA())
	require.NoError(t, err)
	assert.NotEmpty(t, raw)
	_, _, err = c.Git.GetTree(ctx, owner, repo, strings.Repeat("0", 40), true)
	require.ErrorContains(t, err, "404")
	_, _, err = c.Git.GetBlob(ctx, owner, repo, strings.Repeat("0", 40))
	require.ErrorContains(t, err, "404")
}

func TestLargeTreesAreCutUnlessAskedLevelByLevel(t *testing.T) {
	ctx := context.Background()
	r, root, _, _ := forked(t)
	c := client(t, New(t, Options{Git: r.Dir, MostTree: 2}))
	tree, _, err := c.Git.GetTree(ctx, owner, repo, root, true)
	require.NoError(t, err)
	assert.True(t, tree.GetTruncated())
	assert.Len(t, tree.Entries, 2)
	tree, _, err = c.Git.GetTree(ctx, owner, repo, root, false)
	require.NoError(t, err)
	assert.False(t, tree.GetTruncated())
	assert.Len(t, tree.Entries, 3)
}

func TestCompare(t *testing.T) {
	ctx := context.Background()
	r, root, main, topic := forked(t)
	c := client(t, New(t, Options{Git: r.Dir}))
	for _, names := range [][2]string{{main, topic}, {"main", "work/topic"}, {"harbour:main", "spring-tide:work/topic"}} {
		got, _, err := c.Repositories.CompareCommits(ctx, owner, repo, names[0], names[1], nil)
		require.NoError(t, err, names)
		assert.Equal(t, root, got.GetMergeBaseCommit().GetSHA())
		assert.Equal(t, main, got.GetBaseCommit().GetSHA())
		assert.Equal(t, "diverged", got.GetStatus())
		assert.Equal(t, []int{1, 1}, []int{got.GetAheadBy(), got.GetBehindBy()})
		require.Len(t, got.Commits, 1)
		assert.Equal(t, topic, got.Commits[0].GetSHA())
		files := map[string]string{}
		for _, f := range got.Files {
			files[f.GetFilename()] = f.GetStatus()
		}
		assert.Equal(t, map[string]string{"grid/north.csv": "removed", "new.txt": "added", "tide/model.py": "modified"}, files)
	}
	got, _, err := c.Repositories.CompareCommits(ctx, owner, repo, main, topic, &github.ListOptions{Page: 2, PerPage: 1})
	require.NoError(t, err)
	assert.Equal(t, root, got.GetMergeBaseCommit().GetSHA())
	assert.Empty(t, got.Files)
	_, _, err = c.Repositories.CompareCommits(ctx, owner, repo, "main", "nowhere", nil)
	require.ErrorContains(t, err, "404")
}

func TestRelations(t *testing.T) {
	ctx := context.Background()
	r, root, main, _ := forked(t)
	c := client(t, New(t, Options{Git: r.Dir}))
	for want, names := range map[string][2]string{"ahead": {root, main}, "behind": {main, root}, "identical": {main, "main"}} {
		got, _, err := c.Repositories.CompareCommits(ctx, owner, repo, names[0], names[1], nil)
		require.NoError(t, err)
		assert.Equal(t, want, got.GetStatus())
	}
}

func TestBranchesRefsAndCommits(t *testing.T) {
	ctx := context.Background()
	r, root, main, topic := forked(t)
	merge := r.Merge("work/topic")
	r.Git("tag", "--annotate", "--message", "v1", "v1", root)
	c := client(t, New(t, Options{Git: r.Dir}))
	b, _, err := c.Repositories.GetBranch(ctx, owner, repo, "work/topic", 0)
	require.NoError(t, err)
	assert.Equal(t, topic, b.GetCommit().GetSHA())
	_, _, err = c.Repositories.GetBranch(ctx, owner, repo, "nowhere", 0)
	require.ErrorContains(t, err, "404")

	ref, _, err := c.Git.GetRef(ctx, owner, repo, "heads/work/topic")
	require.NoError(t, err)
	assert.Equal(t, []string{"refs/heads/work/topic", topic, "commit"}, []string{ref.GetRef(), ref.GetObject().GetSHA(), ref.GetObject().GetType()})
	ref, _, err = c.Git.GetRef(ctx, owner, repo, "tags/v1")
	require.NoError(t, err)
	assert.Equal(t, "tag", ref.GetObject().GetType())
	_, _, err = c.Git.GetRef(ctx, owner, repo, "heads/nowhere")
	require.ErrorContains(t, err, "404")

	commit, _, err := c.Repositories.GetCommit(ctx, owner, repo, "main", nil)
	require.NoError(t, err)
	assert.Equal(t, merge, commit.GetSHA())
	require.Len(t, commit.Parents, 2)
	assert.Equal(t, []string{main, topic}, []string{commit.Parents[0].GetSHA(), commit.Parents[1].GetSHA()})
	raw, _, err := c.Git.GetCommit(ctx, owner, repo, root)
	require.NoError(t, err)
	assert.Equal(t, "root", raw.GetMessage())
	assert.Equal(t, r.Git("rev-parse", root+"^{tree}"), raw.GetTree().GetSHA())
}

func TestContents(t *testing.T) {
	ctx := context.Background()
	r, root, _, _ := forked(t)
	large := r.Commit("large", map[string]string{"large.csv": strings.Repeat("x", mostContents+1), "a b/c#d.toml": "spaces\n"})
	c := client(t, New(t, Options{Git: r.Dir}))
	get := func(path, ref string) (*github.RepositoryContent, []*github.RepositoryContent, error) {
		file, dir, _, err := c.Repositories.GetContents(ctx, owner, repo, path, &github.RepositoryContentGetOptions{Ref: ref})
		return file, dir, err
	}
	file, _, err := get("tide/model.py", "work/topic")
	require.NoError(t, err)
	text, err := file.GetContent()
	require.NoError(t, err)
	assert.Equal(t, "print(2)\n", text)
	file, _, err = get("a b/c#d.toml", "main")
	require.NoError(t, err)
	assert.Equal(t, "a b/c#d.toml", file.GetPath())
	file, _, err = get("large.csv", large)
	require.NoError(t, err)
	assert.Equal(t, "none", file.GetEncoding())
	assert.Equal(t, mostContents+1, file.GetSize())
	_, dir, err := get("grid", root)
	require.NoError(t, err)
	require.Len(t, dir, 1)
	assert.Equal(t, []string{"file", "grid/north.csv"}, []string{dir[0].GetType(), dir[0].GetPath()})
	_, _, err = get("nowhere", root)
	require.ErrorContains(t, err, "404")
	_, _, err = get("tide/model.py", "nowhere")
	require.ErrorContains(t, err, "404")
}

func TestWithoutARepositoryThereAreNoCommits(t *testing.T) {
	_, _, err := client(t, New(t, Options{})).Repositories.GetCommit(context.Background(), owner, repo, "main", nil)
	require.ErrorContains(t, err, "404")
}
