package github

import (
	"net/http"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/inputs"
	"budgetcheck/report/github/apitest"
)

// forkedHistory has main and a branch that left it, with main moved on since,
// and a tag main that lies elsewhere.
func forkedHistory(t *testing.T) (repo *apitest.Repo, left, tip, head string) {
	repo = apitest.NewRepo(t)
	trap := repo.Commit("first", map[string]string{"a": "1"})
	left = repo.Commit("second", map[string]string{"a": "2"})
	repo.Branch("release/2031.1", left)
	head = repo.Commit("work", map[string]string{"b": "1"})
	repo.Checkout("main")
	tip = repo.Commit("third", map[string]string{"a": "3"})
	repo.Git("tag", "main", trap)
	return repo, left, tip, head
}

func TestMeet(t *testing.T) {
	repo, left, tip, head := forkedHistory(t)
	server := apitest.New(t, apitest.Options{Git: repo.Dir})
	h := hostOf(t, server)
	for _, c := range []struct {
		what, ref, head string
		tip, base       string
		asked           []string
	}{
		{"a branch", "main", head, tip, left, []string{"git/ref/heads/main", "compare/" + tip + "..." + head + "?page=2&per_page=1"}},
		{"a tip", tip, head, tip, left, []string{"compare/" + tip + "..." + head + "?page=2&per_page=1"}},
		{"an older tip", left, head, left, left, []string{"compare/" + left + "..." + head + "?page=2&per_page=1"}},
		{"slashes", "release/2031.1", tip, head, left, []string{"git/ref/heads/release/2031.1", "compare/" + head + "..." + tip + "?page=2&per_page=1"}},
		{"its own tip", "main", tip, tip, tip, []string{"git/ref/heads/main"}},
		{"the same commit", head, head, head, head, nil},
	} {
		before := len(server.Calls())
		gotTip, gotBase, err := h.Repository().Meet(t.Context(), c.ref, c.head)
		require.NoError(t, err, c.what)
		assert.Equal(t, c.tip, gotTip, c.what)
		assert.Equal(t, c.base, gotBase, c.what)
		var asked []string
		for _, call := range server.Calls()[before:] {
			asked = append(asked, call.Path)
		}
		assert.Equal(t, c.asked, asked, c.what)
	}
}

// The API and a clone answer alike, once no tag is in the way.
func TestMeetIsWhatGitSays(t *testing.T) {
	repo, _, tip, head := forkedHistory(t)
	repo.Git("tag", "--delete", "main")
	local, err := inputs.OpenGit(t.Context(), repo.Dir)
	require.NoError(t, err)
	remote := hostOf(t, apitest.New(t, apitest.Options{Git: repo.Dir})).Repository()
	for _, ref := range []string{"main", "release/2031.1", tip, head} {
		for _, commit := range []string{tip, head} {
			wantTip, wantBase, err := local.Meet(t.Context(), ref, commit)
			require.NoError(t, err)
			gotTip, gotBase, err := remote.Meet(t.Context(), ref, commit)
			require.NoError(t, err)
			assert.Equal(t, []string{wantTip, wantBase}, []string{gotTip, gotBase}, "%s %s", ref, commit)
		}
	}
}

func TestMeetRefusesOddAnswers(t *testing.T) {
	repo, _, tip, head := forkedHistory(t)
	for _, c := range []struct{ path, body, says string }{
		{"git/ref", `{"ref":"refs/heads/main-2","object":{"sha":"` + tip + `"}}`, `heads/main: the host answers with "refs/heads/main-2": not in the repository`},
		{"git/ref", `{"ref":"refs/heads/main","object":{}}`, "the commit of heads/main is missing"},
		{"git/ref", `{"ref":"refs/heads/main"}`, "the commit of heads/main is missing"},
		{"compare", `{"base_commit":{"sha":"` + tip + `"}}`, "where " + head + " left main: merge_base_commit.sha is missing"},
		{"compare", `{"merge_base_commit":{"sha":"main"}}`, "where " + head + ` left main: merge_base_commit.sha is "main", not the full id of a commit (40 or 64 hexadecimal digits)`},
	} {
		server := apitest.New(t, apitest.Options{Git: repo.Dir})
		server.Plant(apitest.Fault{Path: c.path, Status: http.StatusOK, Body: c.body})
		gotTip, gotBase, err := hostOf(t, server).Repository().Meet(t.Context(), "main", head)
		require.EqualError(t, err, c.says)
		assert.Empty(t, gotTip+gotBase, c.says)
	}
}
