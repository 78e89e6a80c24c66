package github

import (
	"context"
	"strings"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/report/github/apitest"
)

func TestPlaces(t *testing.T) {
	got, err := ParsePlaces("comment", "check", "summary", "check", "status")
	require.NoError(t, err)
	assert.Equal(t, []Place{Comment, Check, Summary, Status}, got)
	got, err = ParsePlaces()
	require.NoError(t, err)
	assert.Empty(t, got)
	for _, word := range []string{"Comment", "comments", "", "none", "check,status"} {
		_, err = ParsePlaces("comment", word)
		require.ErrorContains(t, err, "write any of comment, check, status, summary")
	}
}

func TestNoPlacesPostNothing(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, _ := patient(t, s)
	p := posting()
	p.Places = nil
	post(t, h, p)
	assert.Empty(t, s.Calls())
}

// An ordinary pull request costs four calls, and one more where the comment is
// new: whoever creates one looks whether another job did too.
func TestAnOrdinaryPullRequestCostsFourCalls(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, _ := patient(t, s)
	post(t, h, posting())
	assert.Equal(t, 5, h.Calls())

	p := posting() // the next push
	p.Commit, p.Statement = baseSHA, statement(4)
	h, _ = patient(t, s)
	post(t, h, p)
	assert.Equal(t, 4, h.Calls())
	assert.Len(t, s.CheckRuns(), 2)
	assert.Contains(t, only(t, s).Body, "rule 4")
}

func TestWithoutAPullRequestThereIsNoComment(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, _ := patient(t, s)
	p := posting()
	p.Pull = 0
	post(t, h, p)
	assert.Zero(t, s.Count("", "comments"))
	assert.Equal(t, 2, h.Calls())
}

func TestWithoutACommitThereIsNoCheck(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, _ := patient(t, s)
	p := posting()
	for _, bad := range []string{"", "main", headSHA[:12], "../" + headSHA} {
		p.Commit = bad
		notices := h.Post(context.Background(), p)
		require.Len(t, notices, 1)
		assert.Equal(t, "check: the commit to post to is not known", notices[0].String())
	}
	assert.Zero(t, s.Count("GET", "check-runs")+s.Count("POST", "check-runs"))
	only(t, s)
}

// Without a token, or without a host at all, the summary is what there is.
func TestWithoutATokenOnlyTheSummaryIsWritten(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	anonymous, _ := patient(t, s, func(o *Options) { o.Token = "" })
	for _, h := range []*Host{anonymous, nil} {
		f := newFiles(t)
		p := posting()
		p.Places, p.Runner = []Place{Comment, Check, Summary}, f.runner()
		notices := h.Post(context.Background(), p)
		assert.Equal(t, []Notice{{Comment, false, "not posted, for there is no token"}, {Check, false, "not posted, for there is no token"}}, notices)
		assert.Contains(t, f.summary(t), "**Gate closed:**")
	}
	assert.Empty(t, s.Calls())
}

// Each place is tried whatever became of the others.
func TestWhatFailsInOnePlaceStopsNoOther(t *testing.T) {
	for place, part := range map[Place]string{Check: "check-runs", Comment: "comments", Status: "statuses"} {
		t.Run(string(place), func(t *testing.T) {
			s := apitest.New(t, apitest.Options{})
			s.Plant(apitest.Fault{Path: part, Status: 500, Body: "<html>we are sorry</html>"})
			h, _ := patient(t, s)
			f := newFiles(t)
			p := posting()
			p.Places, p.Runner = []Place{Comment, Check, Status, Summary}, f.runner()
			notices := h.Post(context.Background(), p)
			require.Len(t, notices, 1)
			assert.Equal(t, place, notices[0].Place)
			assert.True(t, notices[0].Failed)
			assert.Contains(t, notices[0].Text, "500")
			assert.Equal(t, place != Check, len(s.CheckRuns()) == 1)
			assert.Equal(t, place != Comment, len(s.Comments(214)) == 1)
			assert.Equal(t, place != Status, len(s.Statuses()) == 1)
			assert.Contains(t, f.summary(t), "**Gate closed:**")
		})
	}
}

// A host that stays down is told, in bounded time, and no more than told.
func TestAHostThatStaysDown(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.Plant(apitest.Fault{Status: 503})
	h, c := patient(t, s)
	began := c.now()
	p := posting()
	p.Places = []Place{Comment, Check, Status}
	notices := h.Post(context.Background(), p)
	require.Len(t, notices, 3)
	for _, n := range notices {
		assert.True(t, n.Failed)
	}
	assert.LessOrEqual(t, c.now().Sub(began), patience)
}

func TestASlowHostIsWaitedForToTheDeadlineOnly(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	end := make(chan struct{})
	t.Cleanup(func() { close(end) }) // before the server closes
	s.Plant(apitest.Fault{Before: func() { <-end }})
	h, _ := patient(t, s, func(o *Options) { o.Deadline = 50 * time.Millisecond })
	notices := h.Post(context.Background(), posting())
	require.Len(t, notices, 2)
	for _, n := range notices {
		assert.Contains(t, n.Text, errLate.Error())
	}
}

func TestGarbageIsTold(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.Plant(apitest.Fault{Method: "GET", Path: "comments", Status: 200, Body: "<html>maintenance</html>"})
	h, _ := patient(t, s)
	notices := h.Post(context.Background(), posting())
	require.Len(t, notices, 1)
	assert.Equal(t, Comment, notices[0].Place)
	assert.True(t, notices[0].Failed)
	assert.Zero(t, s.Count("POST", "comments"), "nobody knows whether there is one")
}

func TestACrookedHostCannotSpeakThroughANotice(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.Plant(apitest.Fault{Path: "comments", Status: 422, Body: `{"message":"no\n::set-output name=gate::open\u202e"}`})
	h, _ := patient(t, s)
	notices := h.Post(context.Background(), posting())
	require.Len(t, notices, 1)
	assert.NotContains(t, notices[0].Text, "\n")
	assert.NotContains(t, notices[0].Text, "\u202e")
	assert.Contains(t, notices[0].Text, `no\u000a`)
}

// What could not be judged is posted too: a check that never comes would keep
// a pull request waiting.
func TestWhatCouldNotBeJudgedIsPosted(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, _ := patient(t, s)
	p := posting()
	p.Statement, p.Trouble = nil, "the policy cannot be used:\nbudgetcheck.toml:3: unknown key `limt` @everyone"
	post(t, h, p)
	assert.Contains(t, only(t, s).Body, "**Gate unknown:** this change could not be judged.\n\n- `the policy cannot be used:`\n- ``budgetcheck.toml:3: unknown key `limt` @everyone``\n")
	assert.Equal(t, "failure", s.CheckRuns()[0].Conclusion)
}

func TestTheMarkdownOfTheCallerIsPosted(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, _ := patient(t, s)
	p := posting()
	p.Markdown = "**Gate closed:** as written elsewhere\n"
	post(t, h, p)
	assert.Equal(t, mark+p.Markdown, only(t, s).Body)
	assert.Equal(t, p.Markdown, s.CheckRuns()[0].Summary)
}

func TestNamesAreTidied(t *testing.T) {
	for name, want := range map[string]string{"": "budgetcheck", " tide \n": "tide", "a\nb": `a\u000ab`, strings.Repeat("x", 101): strings.Repeat("x", 97) + "..."} {
		assert.Equal(t, want, Posting{Name: name}.complete().Name)
	}
}
