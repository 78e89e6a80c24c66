package apitest

import (
	"context"
	"fmt"
	"strings"
	"testing"

	"github.com/google/go-github/v60/github"
	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// These tests need no asserts of their own to be worth having: each answer is
// held against the description.

func TestComments(t *testing.T) {
	ctx := context.Background()
	s := New(t, Options{})
	c := client(t, s)
	stranger := s.AddComment(7, Person("stranger"), "first")
	made, _, err := c.Issues.CreateComment(ctx, owner, repo, 7, &github.IssueComment{Body: github.String("second")})
	require.NoError(t, err)
	assert.Equal(t, "github-actions[bot]", made.GetUser().GetLogin())
	assert.Greater(t, made.GetID(), stranger.ID)
	_, _, err = c.Issues.EditComment(ctx, owner, repo, made.GetID(), &github.IssueComment{Body: github.String("edited")})
	require.NoError(t, err)
	_, err = c.Issues.DeleteComment(ctx, owner, repo, stranger.ID)
	require.NoError(t, err)
	_, err = c.Issues.DeleteComment(ctx, owner, repo, stranger.ID)
	require.ErrorContains(t, err, "404")
	assert.Equal(t, []Comment{{made.GetID(), 7, Bot("github-actions"), "edited"}}, s.Comments(7))
	assert.Empty(t, s.Comments(8))
}

func TestCommentsComeInPages(t *testing.T) {
	ctx := context.Background()
	s := New(t, Options{})
	for n := range 7 {
		s.AddComment(7, Person("pilot"), fmt.Sprint(n))
	}
	o := &github.IssueListCommentsOptions{ListOptions: github.ListOptions{PerPage: 3}}
	var seen []string
	for {
		list, resp, err := client(t, s).Issues.ListComments(ctx, owner, repo, 7, o)
		require.NoError(t, err)
		for _, c := range list {
			seen = append(seen, c.GetBody())
		}
		if resp.NextPage == 0 {
			break
		}
		o.Page = resp.NextPage
	}
	assert.Equal(t, "0123456", strings.Join(seen, ""))
	assert.Equal(t, 3, s.Count("GET", "comments"))
}

func TestOwnOnlyKeepsCommentsOfOthers(t *testing.T) {
	ctx := context.Background()
	s := New(t, Options{OwnOnly: true})
	other := s.AddComment(7, Person("stranger"), "mine")
	_, _, err := client(t, s).Issues.EditComment(ctx, owner, repo, other.ID, &github.IssueComment{Body: github.String("x")})
	require.ErrorContains(t, err, "403")
	_, err = client(t, s).Issues.DeleteComment(ctx, owner, repo, other.ID)
	require.ErrorContains(t, err, "403")
	assert.Equal(t, "mine", s.Comments(7)[0].Body)
}

func TestChecksAddAnnotationsUp(t *testing.T) {
	ctx := context.Background()
	s := New(t, Options{})
	c := client(t, s)
	out := &github.CheckRunOutput{Title: github.String("t"), Summary: github.String("s"), Annotations: []*github.CheckRunAnnotation{{
		Path: github.String("budgetcheck.toml"), StartLine: github.Int(3), EndLine: github.Int(3), AnnotationLevel: github.String("notice"), Message: github.String("m")}}}
	made, _, err := c.Checks.CreateCheckRun(ctx, owner, repo, github.CreateCheckRunOptions{Name: "tide", HeadSHA: "abc", Status: github.String("in_progress"), Output: out})
	require.NoError(t, err)
	assert.Equal(t, "github-actions", made.GetApp().GetSlug())
	_, _, err = c.Checks.UpdateCheckRun(ctx, owner, repo, made.GetID(), github.UpdateCheckRunOptions{Name: "tide", Conclusion: github.String("success"), Status: github.String("completed"), Output: out})
	require.NoError(t, err)
	other := s.AddCheckRun(CheckRun{Name: "tide", HeadSHA: "abc", App: "other", Status: "queued"})
	s.AddCheckRun(CheckRun{Name: "wind", HeadSHA: "abc", App: "github-actions", Status: "queued"})
	_, _, err = c.Checks.UpdateCheckRun(ctx, owner, repo, other.ID, github.UpdateCheckRunOptions{Name: "tide"})
	require.ErrorContains(t, err, "403", "another app's")
	list, _, err := c.Checks.ListCheckRunsForRef(ctx, owner, repo, "abc", &github.ListCheckRunsOptions{CheckName: github.String("tide")})
	require.NoError(t, err)
	require.Equal(t, 2, list.GetTotal())
	assert.Equal(t, 2, list.CheckRuns[1].GetOutput().GetAnnotationsCount())
	assert.Equal(t, []Annotation{{"budgetcheck.toml", "notice", "", "m", 3}, {"budgetcheck.toml", "notice", "", "m", 3}}, s.CheckRuns()[0].Annotations)
}

func TestChecksAreForApps(t *testing.T) {
	s := New(t, Options{As: Person("pilot")})
	_, _, err := client(t, s).Checks.CreateCheckRun(context.Background(), owner, repo, github.CreateCheckRunOptions{Name: "tide", HeadSHA: "abc"})
	require.ErrorContains(t, err, "403")
}

func TestStatuses(t *testing.T) {
	ctx := context.Background()
	s := New(t, Options{})
	c := client(t, s)
	_, _, err := c.Repositories.CreateStatus(ctx, owner, repo, "abc", &github.RepoStatus{State: github.String("pending"), Context: github.String("tide"), Description: github.String("d"), TargetURL: github.String("https://harbour.example/1")})
	require.NoError(t, err)
	list, _, err := c.Repositories.ListStatuses(ctx, owner, repo, "abc", nil)
	require.NoError(t, err)
	require.Len(t, list, 1)
	assert.Equal(t, Status{"abc", "pending", "tide", "d", "https://harbour.example/1"}, s.Statuses()[0])
}

func TestPulls(t *testing.T) {
	ctx := context.Background()
	s := New(t, Options{})
	c := client(t, s)
	s.AddPull(Pull{Number: 7, Title: "gauge", Head: Branch{"gauge", "h7"}, Base: Branch{"main", "b"}})
	s.AddPull(Pull{Number: 8, State: "closed", Merged: true, MergeCommit: "m8", Head: Branch{"gauge", "h8"}, Base: Branch{"main", "b"}})
	s.AddPull(Pull{Number: 9, HeadOf: "spring-tide/tide-forecast", OpenedBy: "spring-tide", Head: Branch{"main", "h9"}, Base: Branch{"main", "b"}, Commits: []string{"c9"}})
	s.AddPull(Pull{Number: 10, HeadGone: true, HeadOf: "gone/tide-forecast", Head: Branch{"x", "h10"}, Base: Branch{"old", "b"}})

	p, _, err := c.PullRequests.Get(ctx, owner, repo, 9)
	require.NoError(t, err)
	assert.Equal(t, "spring-tide/tide-forecast", p.GetHead().GetRepo().GetFullName())
	assert.Equal(t, "harbour/tide-forecast", p.GetBase().GetRepo().GetFullName())
	p, _, err = c.PullRequests.Get(ctx, owner, repo, 10)
	require.NoError(t, err)
	assert.Nil(t, p.Head.Repo)
	_, _, err = c.PullRequests.Get(ctx, owner, repo, 11)
	require.ErrorContains(t, err, "404")

	for _, q := range []struct {
		o    github.PullRequestListOptions
		want []int
	}{
		{github.PullRequestListOptions{}, []int{7, 9, 10}},
		{github.PullRequestListOptions{State: "all", Head: "harbour:gauge"}, []int{7, 8}},
		{github.PullRequestListOptions{State: "closed"}, []int{8}},
		{github.PullRequestListOptions{Head: "spring-tide:main"}, []int{9}},
		{github.PullRequestListOptions{Base: "old"}, []int{10}},
	} {
		list, _, err := c.PullRequests.List(ctx, owner, repo, &q.o)
		require.NoError(t, err)
		assert.Equal(t, q.want, numbers(list), "%+v", q.o)
	}
	for sha, want := range map[string][]int{"c9": {9}, "h9": {9}, "m8": {8}, "none": nil} {
		list, _, err := c.PullRequests.ListPullRequestsWithCommit(ctx, owner, repo, sha, nil)
		require.NoError(t, err)
		assert.Equal(t, want, numbers(list), sha)
	}
}

func numbers(list []*github.PullRequest) (n []int) {
	for _, p := range list {
		n = append(n, p.GetNumber())
	}
	return n
}

// A forge answers below another address, and with less.
func TestForge(t *testing.T) {
	ctx := context.Background()
	s := New(t, Options{Forge: true, As: Person("forge-actions")})
	assert.True(t, strings.HasSuffix(s.URL, "/api/v1"))
	c := client(t, s)
	made, _, err := c.Issues.CreateComment(ctx, owner, repo, 7, &github.IssueComment{Body: github.String("x")})
	require.NoError(t, err)
	assert.Nil(t, made.User.Type)
	assert.Nil(t, made.NodeID)
	assert.Equal(t, "forge-actions", made.GetUser().GetLogin())
	_, _, err = c.Repositories.CreateStatus(ctx, owner, repo, "abc", &github.RepoStatus{State: github.String("failure")})
	require.NoError(t, err)
	_, resp, err := c.Checks.ListCheckRunsForRef(ctx, owner, repo, "abc", nil)
	require.Error(t, err)
	assert.Equal(t, 404, resp.StatusCode)
	u, _, err := c.Users.Get(ctx, "")
	require.NoError(t, err)
	assert.Equal(t, "forge-actions", u.GetLogin())
}
