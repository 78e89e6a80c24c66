package github

import (
	"context"
	"fmt"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/report/github/apitest"
)

// lost are the ways in which the answer to a creation gets lost.
var lost = map[string]apitest.Fault{
	"done, dropped":     {Drop: true, Done: true},
	"done, 500":         {Status: 500, Done: true},
	"done, 502":         {Status: 502, Done: true},
	"done, 504":         {Status: 504, Done: true},
	"done, garbage":     {Status: 201, Body: "<html>", Done: true},
	"not done, dropped": {Drop: true},
	"not done, 502":     {Status: 502},
}

// Whether the lost creation was carried out or not, one comment comes of it,
// whoever we are.
func TestALostAnswerMakesNoSecondComment(t *testing.T) {
	for name, f := range lost {
		for who, o := range map[string]apitest.Options{"app": {}, "person": {As: apitest.Person("keeper")}, "forge": {Forge: true}} {
			for _, places := range [][]Place{{Comment}, {Check, Comment}} {
				t.Run(fmt.Sprint(name, " ", who, " ", places), func(t *testing.T) {
					s := apitest.New(t, o)
					f.Method, f.Path, f.Times = "POST", "comments", 1
					s.Plant(f)
					h, _ := patient(t, s)
					p := posting()
					p.Places = places
					post(t, h, p)
					assert.Contains(t, only(t, s).Body, "Gate closed")
					post(t, h, p)
					assert.Equal(t, map[bool]int{true: 1, false: 2}[f.Done], s.Count("POST", "comments"))
				})
			}
		}
	}
}

func TestALostAnswerMayComeTwice(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.Plant(apitest.Fault{Method: "POST", Path: "comments", Status: 502, Times: 2})
	h, c := patient(t, s)
	post(t, h, posting())
	only(t, s)
	assert.Equal(t, seconds(1, 2), c.waits)
}

func TestALostAnswerIsNotSoughtForEver(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.Plant(apitest.Fault{Method: "POST", Path: "comments", Status: 502})
	h, _ := patient(t, s)
	notices := h.Post(context.Background(), posting())
	require.Len(t, notices, 1)
	assert.Contains(t, notices[0].Text, "502")
	assert.Equal(t, attempts, s.Count("POST", "comments"))
}

func TestALostAnswerIsNotSoughtPastTheDeadline(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.Plant(apitest.Fault{Method: "POST", Path: "comments", Status: 502})
	h, _ := patient(t, s, func(o *Options) { o.Deadline = 2e9 })
	notices := h.Post(context.Background(), posting())
	require.Len(t, notices, 1)
	assert.Contains(t, notices[0].Text, errLate.Error())
	assert.Equal(t, 2, s.Count("POST", "comments"))
}

// A stranger who repeats our words is not taken for us where we know who we
// are, and theirs is not touched where we do not.
func TestAStrangerWhoRepeatsOurWords(t *testing.T) {
	for _, places := range [][]Place{{Comment}, {Check, Comment}} {
		s := apitest.New(t, apitest.Options{})
		h, _ := patient(t, s)
		p := posting().complete()
		p.Places = places
		body := h.commentBody(p)
		s.Plant(apitest.Fault{Method: "POST", Path: "comments", Status: 502, Times: 1, Before: func() {
			s.AddComment(214, apitest.Person("stranger"), body)
		}})
		post(t, h, p)
		p.Statement = statement(4)
		p.Markdown = ""
		post(t, h, p)
		all := s.Comments(214)
		require.Len(t, all, 2)
		assert.Equal(t, []string{"stranger", body}, []string{all[0].Author.Login, all[0].Body})
		assert.Contains(t, all[1].Body, "rule 4")
	}
}

// A creation that was refused is no lost one.
func TestARefusedCreationIsNotRepeated(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.Plant(apitest.Fault{Method: "POST", Path: "comments", Status: 422})
	h, _ := patient(t, s)
	notices := h.Post(context.Background(), posting())
	require.Len(t, notices, 1)
	assert.True(t, notices[0].Failed)
	assert.Equal(t, 1, s.Count("POST", "comments"))
}

// The host limits calls: nothing was done, and the creation is sent again.
func TestALimitedCreationIsSentAgain(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.Plant(apitest.Fault{Method: "POST", Path: "comments", Status: 403, Times: 1, Header: map[string]string{"Retry-After": "7"}})
	h, c := patient(t, s)
	post(t, h, posting())
	only(t, s)
	assert.Equal(t, seconds(8), c.waits)
	assert.Equal(t, 2, s.Count("POST", "comments"))
}

// A comment of ours that may not be edited any more, such as a locked one, is
// not taken for the one whose creation got lost.
func TestAnOldCommentIsNotTheLostOne(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.AddComment(214, apitest.Bot("github-actions"), mark+"old")
	s.Refuse("PATCH", "comments")
	s.Plant(apitest.Fault{Method: "POST", Path: "comments", Status: 502, Times: 1})
	h, _ := patient(t, s)
	post(t, h, posting())
	all := s.Comments(214)
	require.Len(t, all, 2)
	assert.Contains(t, all[1].Body, "Gate closed")
	assert.Equal(t, 2, s.Count("POST", "comments"))
}
