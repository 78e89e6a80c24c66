package github

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/report/github/apitest"
)

// A forge of another make has comments and commit statuses, and no checks. The
// same code posts there.
func TestAForge(t *testing.T) {
	for name, me := range map[string]apitest.User{
		"that tells whose token it is": {ID: 7, Login: "forge-actions"},
		"that does not":                {ID: -2, Login: "forge-actions"},
	} {
		t.Run(name, func(t *testing.T) {
			s := apitest.New(t, apitest.Options{Forge: true, As: me})
			if me.ID < 0 {
				s.Refuse("GET", "/user")
			}
			strange := s.AddComment(214, apitest.User{ID: 99, Login: "stranger"}, mark+"**Gate open**")
			for n := range 3 {
				h, _ := patient(t, s)
				p := posting()
				p.Statement = statement(4 + n)
				post(t, h, p)
			}
			all := s.Comments(214)
			require.Len(t, all, 2, "one comment for all three, and the stranger's")
			assert.Equal(t, strange, all[0])
			assert.Equal(t, "forge-actions", all[1].Author.Login)
			assert.Contains(t, all[1].Body, "rule 6")
			require.Len(t, s.Statuses(), 3)
			assert.Equal(t, "failure", s.Statuses()[0].State)
			assert.Empty(t, s.CheckRuns())
		})
	}
}

// Where nothing says who we are, creating a comment does.
func TestAForgeWithoutTheQuestion(t *testing.T) {
	for _, code := range []int{401, 404} {
		s := apitest.New(t, apitest.Options{Forge: true})
		s.Plant(apitest.Fault{Path: "/user", Status: code})
		h, _ := patient(t, s)
		p := posting()
		p.Places = []Place{Comment}
		post(t, h, p)
		first := only(t, s)
		p.Statement = statement(4)
		post(t, h, p)
		again := only(t, s)
		assert.Equal(t, first.ID, again.ID, "the oldest is kept")
		assert.Contains(t, again.Body, "rule 4")
	}
}

func TestAForgeThatListsAllCommentsAtOnce(t *testing.T) {
	s := apitest.New(t, apitest.Options{Forge: true})
	for range 300 {
		s.AddComment(214, apitest.User{ID: 99, Login: "pilot"}, "chatter")
	}
	h, _ := patient(t, s)
	post(t, h, posting())
	post(t, h, posting())
	only(t, s)
	assert.Equal(t, 3, s.Count("GET", "comments"))
}
