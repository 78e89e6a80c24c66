package github

import (
	"cmp"
	"errors"
	"fmt"
	"net/http"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"sync"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/inputs"
	"budgetcheck/report/github/apitest"
)

// motley makes a repository with every kind of entry that a tree can have.
func motley(t testing.TB) (repo *apitest.Repo, commit string) {
	t.Helper()
	repo = apitest.NewRepo(t)
	first := repo.Commit("first", map[string]string{
		"budgetcheck.toml": "format = 1\n", "tide/train.py": "print(1)\n", "tide/deep/er/model.py": "print(2)\n", "tide/ünï code.py": "print(3)\n",
		"docs/a b.md": "text\n", "docs/\"quoted\"\tname": "text\n", "empty/keep": "x", "run.sh": "#!/bin/sh\n", "same/one": "same\n", "same/two": "same\n",
		"same/binary": "\x00\xff\xfe\r\n", "same/long": strings.Repeat("0123456789\n", 10_000),
	})
	require.NoError(t, os.Symlink("tide", filepath.Join(repo.Dir, "link")))
	require.NoError(t, os.Chmod(filepath.Join(repo.Dir, "run.sh"), 0o755))
	repo.Git("add", "link", "run.sh")
	repo.Git("update-index", "--add", "--cacheinfo", "160000,"+first+",vendor/gauges")
	repo.Git("commit", "--quiet", "--message", "second")
	return repo, repo.Git("rev-parse", "HEAD")
}

func sorted(tree inputs.Tree) inputs.Tree {
	tree = slices.Clone(tree)
	slices.SortFunc(tree, func(a, b inputs.File) int { return cmp.Compare(a.Path, b.Path) })
	return tree
}

// A clone and the API must give the same inputs, or nothing would ever stand
// for anything.
func TestTreeIsWhatGitSays(t *testing.T) {
	repo, commit := motley(t)
	local, err := inputs.OpenGit(t.Context(), repo.Dir)
	require.NoError(t, err)
	want, err := local.Tree(t.Context(), commit)
	require.NoError(t, err)
	require.Len(t, want, 14, "twelve files, a link and a submodule")
	for _, most := range []int{0, 8, 3, 1} {
		server := apitest.New(t, apitest.Options{Git: repo.Dir, MostTree: most})
		got, err := hostOf(t, server).Repository().Tree(t.Context(), commit)
		require.NoError(t, err)
		assert.Equal(t, sorted(want), sorted(got), "at most %d entries in an answer", most)
		assert.Equal(t, want.Hash(nil, nil), got.Hash(nil, nil))
		if most == 0 {
			assert.Len(t, server.Calls(), 1)
			assert.Equal(t, 1, server.Count(http.MethodGet, "git/trees/"+commit+"?recursive=1"))
		}
	}
}

// Cut off answers look whole but for one key.
func TestTruncatedTreeIsWalked(t *testing.T) {
	repo, commit := motley(t)
	server := apitest.New(t, apitest.Options{Git: repo.Dir, MostTree: 4})
	_, err := hostOf(t, server).Repository().Tree(t.Context(), commit)
	require.NoError(t, err)
	// The root and tide are too large: asked again level by level. In tide is deep.
	folders := strings.Fields(repo.Git("ls-tree", "-d", "--format=%(objectname)", commit))
	require.Len(t, folders, 5)
	assert.Equal(t, 1, server.Count(http.MethodGet, "git/trees/"+commit+"?recursive=1"))
	for _, f := range folders {
		assert.Equal(t, 1, server.Count(http.MethodGet, "git/trees/"+f+"?recursive=1"), f)
	}
	assert.Len(t, server.Calls(), 2+len(folders)+2)
}

// Base and head share most folders.
func TestSharedFoldersAreAskedForOnce(t *testing.T) {
	repo, commit := motley(t)
	next := repo.Commit("third", map[string]string{"docs/new.md": "text\n"})
	server := apitest.New(t, apitest.Options{Git: repo.Dir, MostTree: 4})
	r := hostOf(t, server).Repository()
	_, err := r.Tree(t.Context(), commit)
	require.NoError(t, err)
	before := len(server.Calls())
	_, err = r.Tree(t.Context(), next)
	require.NoError(t, err)
	assert.Equal(t, 3, len(server.Calls())-before, "the root twice, and docs")
}

func TestTreeThatTheAPICannotList(t *testing.T) {
	repo, commit := motley(t)
	server := apitest.New(t, apitest.Options{Git: repo.Dir})
	cut := `{"sha":"` + commit + `","truncated":true,"tree":[]}`
	server.Plant(apitest.Fault{Path: "git/trees", Status: http.StatusOK, Body: cut})
	_, err := hostOf(t, server).Repository().Tree(t.Context(), commit)
	require.EqualError(t, err, "files of commit "+commit+": tree "+commit+" has too many entries for the API, it lists only a part; judge in a job with a full clone")
}

func TestTreeWithOddEntries(t *testing.T) {
	for _, entry := range []string{
		`null`, `{}`, `{"mode":"100644","type":"blob","sha":"` + headSHA + `"}`, `{"path":"a","type":"blob","sha":"` + headSHA + `"}`, `{"path":"a","mode":"100644","type":"blob"}`,
	} {
		server := apitest.New(t, apitest.Options{})
		server.Plant(apitest.Fault{Path: "git/trees", Status: http.StatusOK, Body: `{"tree":[{"path":"a/b","mode":"100644","type":"blob","sha":"` + headSHA + `"},` + entry + `]}`})
		_, err := hostOf(t, server).Repository().Tree(t.Context(), headSHA)
		require.ErrorContains(t, err, "the host lists a file without its mode, path or id", entry)
	}
	server := apitest.New(t, apitest.Options{})
	server.Plant(apitest.Fault{Path: "git/trees", Times: 1, Status: http.StatusOK, Body: `{"truncated":true,"tree":[]}`})
	server.Plant(apitest.Fault{Path: "git/trees", Status: http.StatusOK, Body: `{"tree":[{"path":"a","mode":"040000","type":"tree","sha":"../../../user"}]}`})
	_, err := hostOf(t, server).Repository().Tree(t.Context(), headSHA)
	require.ErrorContains(t, err, `a: "../../../user" is not a full id`)
	assert.Len(t, server.Calls(), 2, "no such address is asked for")
}

func TestWhatTheRepositoryDoesNotHave(t *testing.T) {
	repo, commit := motley(t)
	repo.Git("checkout", "--quiet", "--orphan", "stranger")
	stranger := repo.Commit("unrelated", map[string]string{"b": "1"})
	server := apitest.New(t, apitest.Options{Git: repo.Dir})
	r := hostOf(t, server).Repository()
	for _, id := range []string{headSHA, "main", "", "-x", "../" + headSHA, headSHA[1:], "HEAD^{tree}"} {
		_, err := r.Tree(t.Context(), id)
		require.ErrorIs(t, err, inputs.ErrUnknown, id)
		_, err = r.Blob(t.Context(), inputs.File{Path: "a", Blob: id})
		require.ErrorIs(t, err, inputs.ErrUnknown, id)
		_, _, err = r.Meet(t.Context(), "main", id)
		require.ErrorIs(t, err, inputs.ErrUnknown, id)
	}
	for _, branch := range []string{"absent", "", "a b", "../main", "main?x=y", "\x1b", "refs/heads/main"} {
		_, _, err := r.Meet(t.Context(), branch, commit)
		require.ErrorIs(t, err, inputs.ErrUnknown, branch)
		assertPlain(t, err)
	}
	_, _, err := r.Meet(t.Context(), "main", stranger)
	require.ErrorIs(t, err, inputs.ErrUnknown, "no common ancestor")
}

// What the token may not see may well be there: that is another kind of answer.
func TestRefusalIsNotAbsence(t *testing.T) {
	repo, commit := motley(t)
	server := apitest.New(t, apitest.Options{Git: repo.Dir})
	server.Refuse(http.MethodGet, "")
	r := hostOf(t, server).Repository()
	_, treeErr := r.Tree(t.Context(), commit)
	_, blobErr := r.Blob(t.Context(), inputs.File{Path: "a", Blob: commit})
	_, _, meetErr := r.Meet(t.Context(), "main", commit)
	_, _, baseErr := r.Meet(t.Context(), headSHA, commit)
	for _, err := range []error{treeErr, blobErr, meetErr, baseErr} {
		require.ErrorContains(t, err, "403")
		assert.NotErrorIs(t, err, inputs.ErrUnknown)
	}
}

func TestAbsenceByStatus(t *testing.T) {
	for code, absent := range map[int]bool{400: false, 401: false, 404: true, 409: true, 410: false, 422: true, 451: false} {
		server := apitest.New(t, apitest.Options{})
		server.Plant(apitest.Fault{Status: code})
		_, err := hostOf(t, server).Repository().Tree(t.Context(), headSHA)
		require.ErrorContains(t, err, fmt.Sprint(code))
		assert.Equal(t, absent, errors.Is(err, inputs.ErrUnknown), code)
	}
}

func TestNothingIsAskedTwice(t *testing.T) {
	repo, commit := motley(t)
	first := repo.Git("rev-parse", "HEAD^")
	server := apitest.New(t, apitest.Options{Git: repo.Dir})
	r := hostOf(t, server).Repository()
	var all sync.WaitGroup
	for range 8 {
		all.Go(func() {
			tree, err := r.Tree(t.Context(), commit)
			assert.NoError(t, err)
			slices.Reverse(tree) // whoever asked may do what they like with it
			f, _ := tree.Find("budgetcheck.toml")
			content, err := r.Blob(t.Context(), f)
			assert.NoError(t, err)
			clear(content)
			tip, base, err := r.Meet(t.Context(), "main", first)
			assert.NoError(t, err)
			assert.Equal(t, fmt.Sprint(commit, first), fmt.Sprint(tip, base))
		})
	}
	all.Wait()
	assert.Len(t, server.Calls(), 4)
	tree, err := r.Tree(t.Context(), commit)
	require.NoError(t, err)
	f, _ := tree.Find("budgetcheck.toml")
	content, err := r.Blob(t.Context(), f)
	require.NoError(t, err)
	assert.Equal(t, "format = 1\n", string(content))
}

func TestFailureIsNotKept(t *testing.T) {
	repo, commit := motley(t)
	server := apitest.New(t, apitest.Options{Git: repo.Dir})
	server.Plant(apitest.Fault{Times: 1, Status: http.StatusNotFound})
	r := hostOf(t, server).Repository()
	_, err := r.Tree(t.Context(), commit)
	require.Error(t, err)
	_, err = r.Tree(t.Context(), commit)
	require.NoError(t, err)
}
