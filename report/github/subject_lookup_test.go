package github

import (
	"context"
	"fmt"
	"net/http"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/report/github/apitest"
)

// hostOf is the client of a test server.
func hostOf(t testing.TB, s *apitest.Server) *Host {
	t.Helper()
	h, err := NewHost(Options{API: s.URL, Repository: "harbour/tide-forecast", Token: apitest.Token,
		Sleep: func(context.Context, time.Duration) error { return nil }})
	require.NoError(t, err)
	return h
}

// The pull request that the payloads are about.
func forked() apitest.Pull {
	return apitest.Pull{Number: 214, Head: apitest.Branch{Ref: "main", SHA: headSHA}, Base: apitest.Branch{Ref: "main", SHA: baseSHA}, HeadOf: "spring-tide/tide-forecast"}
}

// own is a pull request from the repository itself.
func own(number int, target string) apitest.Pull {
	return apitest.Pull{Number: number, Head: apitest.Branch{Ref: "longer-gauges", SHA: headSHA}, Base: apitest.Branch{Ref: target, SHA: baseSHA}}
}

var (
	forkRun = Subject{Event: "workflow_run", Cause: "pull_request", Head: headSHA, Fork: true, HeadBranch: "main", HeadOwner: "spring-tide", DefaultBranch: "main", NeedsLookup: true}
	ownRun  = Subject{Event: "workflow_run", Cause: "pull_request", Head: headSHA, HeadBranch: "longer-gauges", HeadOwner: "harbour", DefaultBranch: "main", NeedsLookup: true}
)

// complete asks a server that has some pull requests.
func complete(t *testing.T, s Subject, pulls ...apitest.Pull) (Subject, []string, error) {
	t.Helper()
	server := apitest.New(t, apitest.Options{})
	for _, p := range pulls {
		server.AddPull(p)
	}
	got, err := hostOf(t, server).Complete(t.Context(), s)
	var paths []string
	for _, c := range server.Calls() {
		assert.Equal(t, http.MethodGet, c.Method)
		paths = append(paths, c.Path)
	}
	return got, paths, err
}

const byFork = "pulls?head=spring-tide%3Amain&per_page=100&state=open"

func TestCompleteAsksNothingThatIsKnown(t *testing.T) {
	for _, s := range []Subject{ofPush, ofPull, ofTag, ofDispatch} {
		got, asked, err := complete(t, s)
		require.NoError(t, err)
		assert.Equal(t, s, got)
		assert.Empty(t, asked)
	}
}

func TestCompleteFindsThePullOfARun(t *testing.T) {
	from := func(s Subject, p apitest.Pull) Subject {
		s.Pull, s.Pulls, s.Branch, s.Base, s.NeedsLookup = p.Number, []int{p.Number}, p.Base.Ref, baseSHA, false
		return s
	}
	gone, unnamed := forked(), forkRun
	gone.HeadGone, unnamed.HeadOwner = true, ""
	toRelease := ownRun
	toRelease.Branch = "release"
	for _, c := range []struct {
		what  string
		s     Subject
		pulls []apitest.Pull
		want  Subject
		asked []string
	}{
		{"of a fork", forkRun, []apitest.Pull{forked()}, from(forkRun, forked()), []string{byFork}},
		{"of a fork, beside others", forkRun, []apitest.Pull{own(3, "main"), forked(), own(4, "release")}, from(forkRun, forked()), []string{byFork}},
		{"of the repository", ownRun, []apitest.Pull{forked(), own(3, "main")}, from(ownRun, own(3, "main")), []string{"pulls?head=harbour%3Alonger-gauges&per_page=100&state=open"}},
		{"to the target that was given", toRelease, []apitest.Pull{own(3, "main"), own(4, "release")}, from(toRelease, own(4, "release")), []string{"pulls?head=harbour%3Alonger-gauges&per_page=100&state=open"}},
		{"of a fork that is gone", unnamed, []apitest.Pull{gone}, from(unnamed, gone), []string{"commits/" + headSHA + "/pulls?per_page=100"}},
	} {
		got, asked, err := complete(t, c.s, c.pulls...)
		require.NoError(t, err, c.what)
		assert.Equal(t, c.want, got, c.what)
		assert.Equal(t, c.asked, asked, c.what)
	}
}

func TestCompleteFindsNoPull(t *testing.T) {
	moved, closed, elsewhere, fromHome := forked(), forked(), forked(), forked()
	moved.Head.SHA = queueSHA
	closed.State = "closed"
	elsewhere.HeadOf = "neap-tide/tide-forecast"
	fromHome.HeadOf = ""
	for what, pulls := range map[string][]apitest.Pull{
		"none": nil, "newer commits": {moved}, "closed": {closed}, "another fork's": {elsewhere}, "of the repository itself": {fromHome},
	} {
		got, asked, err := complete(t, forkRun, pulls...)
		require.ErrorIs(t, err, ErrNoPull, what)
		require.EqualError(t, err, "commit "+headSHA+": no open pull request has this commit as its head")
		assert.Equal(t, Subject{}, got)
		assert.Equal(t, []string{byFork, "commits/" + headSHA + "/pulls?per_page=100"}, asked, what)
	}
}

// An owner may have several repositories of one network, and a fork that is
// gone has no owner any more: then only this tells them apart.
func TestCompleteKeepsForksApart(t *testing.T) {
	second := own(3, "main")
	second.HeadOf = "harbour/tide-forecast-2"
	_, _, err := complete(t, ownRun, second)
	require.ErrorIs(t, err, ErrNoPull)

	unnamed, fromHome := forkRun, forked()
	unnamed.HeadOwner, fromHome.HeadOf = "", ""
	_, _, err = complete(t, unnamed, fromHome)
	require.ErrorIs(t, err, ErrNoPull)
}

// What the filters of a host let through is compared once more.
func TestCompleteDoesNotTrustFilters(t *testing.T) {
	moved := forked()
	moved.Head.SHA, moved.Commits = queueSHA, []string{headSHA}
	_, _, err := complete(t, forkRun, moved)
	require.ErrorIs(t, err, ErrNoPull, "the run is for an older commit")

	server := apitest.New(t, apitest.Options{})
	ignored := fmt.Sprintf(`{"number":9,"state":"open","head":{"ref":"main","sha":%q,"repo":{"full_name":"neap-tide/tide-forecast"}},"base":{"ref":"main","sha":%q,"repo":{"full_name":"harbour/tide-forecast"}}}`, headSHA, baseSHA)
	upstream := fmt.Sprintf(`{"number":8,"state":"open","head":{"ref":"main","sha":%q,"repo":{"full_name":"spring-tide/tide-forecast"}},"base":{"ref":"main","sha":%q,"repo":{"full_name":"coast/tide-forecast"}}}`, headSHA, baseSHA)
	server.Plant(apitest.Fault{Path: "pulls", Status: http.StatusOK, Body: "[" + ignored + "," + upstream + ",{},null]"})
	_, err = hostOf(t, server).Complete(t.Context(), forkRun)
	require.ErrorIs(t, err, ErrNoPull)
}

func TestCompleteNeverPicks(t *testing.T) {
	_, _, err := complete(t, ownRun, own(10, "main"), own(9, "release"))
	require.EqualError(t, err, "commit "+headSHA+" is the head of several pull requests (9 10); say by the input branch which target is meant")
	assert.NotErrorIs(t, err, ErrNoPull)
}

func TestCompleteReadsAllPages(t *testing.T) {
	pulls := make([]apitest.Pull, 0, 251)
	for n := range 250 {
		p := own(1000+n, "main")
		p.Head.SHA = queueSHA
		pulls = append(pulls, p)
	}
	got, asked, err := complete(t, ownRun, append(pulls, own(3, "main"))...)
	require.NoError(t, err)
	assert.Equal(t, 3, got.Pull)
	assert.Len(t, asked, 3)
}

func TestCompleteAsksForAGivenPull(t *testing.T) {
	given := func(s Subject, branch, pull, commit string) Subject {
		s, err := s.With(branch, pull, commit)
		require.NoError(t, err)
		return s
	}
	whole := Subject{Branch: "main", Pull: 214, Pulls: []int{214}, Head: headSHA, Base: baseSHA, Fork: true, HeadBranch: "main", HeadOwner: "spring-tide", DefaultBranch: "main"}
	older, lax := whole, whole
	older.Head, older.Stale = mergeSHA, true
	lax.Branch, lax.Base = "lax", ""
	for _, c := range []struct {
		what string
		s    Subject
		want Subject
	}{
		{"from a cluster", given(ofDispatch, "", "214", ""), whole},
		{"with the commit that ran", given(ofDispatch, "", "214", mergeSHA), older},
		{"with the target", given(ofDispatch, "main", "214", ""), whole},
		{"with another branch's rules", given(ofDispatch, "lax", "214", ""), lax},
		{"of a run", given(forkRun, "", "214", ""), whole},
		{"of a run, with its target", given(forkRun, "main", "214", headSHA), whole},
	} {
		got, asked, err := complete(t, c.s, forked())
		require.NoError(t, err, c.what)
		c.want.Event, c.want.Cause = c.s.Event, c.s.Cause
		assert.Equal(t, c.want, got, c.what)
		assert.Equal(t, []string{"pulls/214"}, asked, c.what)
	}
}

// The inputs of a workflow_run may come from an artifact that a fork wrote.
func TestCompleteChecksWhatARunWasGiven(t *testing.T) {
	s, err := forkRun.With("", "3", "")
	require.NoError(t, err)
	innocent := own(3, "main")
	innocent.Head.SHA = queueSHA
	_, _, err = complete(t, s, forked(), innocent)
	require.ErrorIs(t, err, ErrNoPull)
	assert.ErrorContains(t, err, "the input pull is 3, whose head is "+queueSHA+", but the run was for "+headSHA)

	s, err = forkRun.With("lax", "214", "")
	require.NoError(t, err)
	_, _, err = complete(t, s, forked())
	require.EqualError(t, err, `pull request 214 is for the branch "main", not "lax"; leave the input branch out`)

	s, err = Subject{Event: "workflow_run", Cause: "push", Branch: "lax", Head: headSHA}.With("", "214", "")
	require.NoError(t, err)
	_, _, err = complete(t, s, forked())
	require.Error(t, err, "the run's own branch stands")
}

func TestCompleteWithoutThePull(t *testing.T) {
	s, err := ofDispatch.With("", "7", "")
	require.NoError(t, err)
	_, _, err = complete(t, s, forked())
	require.ErrorContains(t, err, "pull request 7: not in the repository, or not shown to the token")
}

func TestCompleteRefusesOddAnswers(t *testing.T) {
	for body, says := range map[string]string{
		`{}`: "the host's answer on a pull request: pull_request.number is 0, not the number of a pull request (1 or more)",
		`{"number":9,"head":{"ref":"x","sha":"` + headSHA + `"},"base":{"ref":"y"}}`:                       "the host answers with pull request 9 where 214 was asked for",
		`{"number":214,"head":{"ref":"x","sha":"main"},"base":{"ref":"y"}}`:                                `pull_request.head.sha is "main", not the full id of a commit (40 or 64 hexadecimal digits)`,
		`{"number":214,"head":{"ref":"x","sha":"` + headSHA + `"},"base":{"ref":"y\u001b[2J"}}`:            `pull_request.base.ref is "y\x1b[2J", not the name of a branch or tag: it has control characters`,
		`{"number":214,"head":{"ref":"x","sha":"` + headSHA + `"},"base":{"ref":"y","sha":"refs/heads/"}}`: `pull_request.base.sha is "refs/heads/", not the full id of a commit (40 or 64 hexadecimal digits)`,
	} {
		server := apitest.New(t, apitest.Options{})
		server.Plant(apitest.Fault{Path: "pulls/214", Status: http.StatusOK, Body: body})
		s, err := ofDispatch.With("", "214", "")
		require.NoError(t, err)
		got, err := hostOf(t, server).Complete(t.Context(), s)
		require.ErrorContains(t, err, says)
		assertPlain(t, err)
		assert.Equal(t, Subject{}, got)
	}
}

// A refusal is no answer: the run may have a pull request.
func TestCompleteWithoutPermission(t *testing.T) {
	server := apitest.New(t, apitest.Options{})
	server.AddPull(forked())
	server.Refuse(http.MethodGet, "pulls")
	_, err := hostOf(t, server).Complete(t.Context(), forkRun)
	require.ErrorContains(t, err, "pull requests of commit "+headSHA+": ")
	assert.NotErrorIs(t, err, ErrNoPull)
}

// Some hosts have no list of the pull requests of a commit.
func TestCompleteOnAHostWithoutThatList(t *testing.T) {
	server := apitest.New(t, apitest.Options{})
	server.Plant(apitest.Fault{Path: "commits/", Status: http.StatusNotFound})
	_, err := hostOf(t, server).Complete(t.Context(), forkRun)
	require.ErrorIs(t, err, ErrNoPull)
}

// tagged makes a repository with a branch, a tag, and a name that is both.
func taggedRepo(t *testing.T) (dir, first, second string) {
	repo := apitest.NewRepo(t)
	first = repo.Commit("first", map[string]string{"a": "1"})
	repo.Git("tag", "v1")
	repo.Git("tag", "--annotate", "v2", "--message", "second release")
	repo.Git("tag", "both")
	repo.Branch("both", first)
	second = repo.Commit("second", map[string]string{"a": "2"})
	return repo.Dir, first, second
}

func TestCompleteTellsTagsFromBranches(t *testing.T) {
	dir, first, second := taggedRepo(t)
	server := apitest.New(t, apitest.Options{Git: dir})
	h := hostOf(t, server)
	for name, tag := range map[string]bool{"v1": true, "v2": true, "both": false, "gone": false} {
		s := Subject{Event: "workflow_run", Cause: "push", Branch: name, Head: first, DefaultBranch: "main", NeedsLookup: true}
		got, err := h.Complete(t.Context(), s)
		require.NoError(t, err, name)
		s.NeedsLookup = false
		if tag {
			s.Branch, s.Tag = "main", name
		}
		assert.Equal(t, s, got, name)
	}
	_, err := h.Complete(t.Context(), Subject{Event: "workflow_run", Cause: "push", Branch: "v1", Head: first, NeedsLookup: true})
	require.EqualError(t, err, `the event does not say which branch the tag "v1" is on; name it by the input branch`)

	got, err := h.Complete(t.Context(), Subject{Event: "workflow_dispatch", Cause: "workflow_dispatch", Branch: "both", NeedsLookup: true})
	require.NoError(t, err)
	assert.Equal(t, second, got.Head, "the tip of the branch, not the tag")
}

func TestCompleteTagsWithoutPermission(t *testing.T) {
	dir, first, _ := taggedRepo(t)
	for _, kind := range []string{"heads", "tags"} {
		server := apitest.New(t, apitest.Options{Git: dir})
		server.Refuse(http.MethodGet, "git/ref/"+kind)
		_, err := hostOf(t, server).Complete(t.Context(), Subject{Event: "workflow_run", Cause: "push", Branch: "v1", Head: first, DefaultBranch: "main", NeedsLookup: true})
		require.Error(t, err, kind)
	}
}

func TestCompleteALoneTag(t *testing.T) {
	_, asked, err := complete(t, ofLoneTag)
	require.EqualError(t, err, `the event does not say which branch the tag "v1" is on; name it by the input branch`)
	assert.Empty(t, asked)
}

func TestCompleteStopsInTime(t *testing.T) {
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	_, err := hostOf(t, apitest.New(t, apitest.Options{})).Complete(ctx, forkRun)
	require.ErrorIs(t, err, context.Canceled)
}
