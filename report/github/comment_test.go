package github

import (
	"context"
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/report/github/apitest"
)

const mark = "<!-- budgetcheck:budgetcheck -->\n"

func TestTheCommentIsCreatedOnceAndThenEdited(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.AddComment(214, apitest.Person("pilot"), "what does this cost?")
	h, _ := patient(t, s)
	post(t, h, posting())
	first := only(t, s)
	assert.Contains(t, first.Body, "**Gate closed:**")

	p := posting()
	p.Statement.Rulings[0].ObservedText = "27 kg"
	post(t, h, p)
	second := only(t, s)
	assert.Equal(t, first.ID, second.ID)
	assert.Contains(t, second.Body, "27 kg")
	assert.Equal(t, []int{1, 1, 0}, []int{s.Count("POST", "comments"), s.Count("PATCH", "comments"), s.Count("DELETE", "comments")})

	post(t, h, p)
	assert.Equal(t, 1, s.Count("PATCH", "comments"), "the same text is not sent again")
	assert.Equal(t, "what does this cost?", s.Comments(214)[0].Body)
}

func TestOneCommentForEachName(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, _ := patient(t, s)
	for _, name := range []string{"budgetcheck", "budget", "nightly --> <b>", "nightly", "", "a--b", "a-%2db"} {
		p := posting()
		p.Name = name
		post(t, h, p)
		post(t, h, p)
	}
	var marks []string
	for _, c := range s.Comments(214) {
		first, _, _ := strings.Cut(c.Body, "\n")
		marks = append(marks, first)
	}
	assert.Equal(t, []string{"<!-- budgetcheck:budgetcheck -->", "<!-- budgetcheck:budget -->", "<!-- budgetcheck:nightly%20-%2d%3e%20%3cb%3e -->",
		"<!-- budgetcheck:nightly -->", "<!-- budgetcheck:a-%2db -->", "<!-- budgetcheck:a-%252db -->"}, marks)
}

func TestSafeNames(t *testing.T) {
	seen := map[string]string{}
	for _, name := range []string{"a", "-a", "a-", "a--", "a-->", "a b", "a%20b", "ä", "a\nb", strings.Repeat("x", 200), strings.Repeat("x", 201), strings.Repeat("-", 99)} {
		safe := safeName(name)
		assert.Regexp(t, `^[A-Za-z0-9_.%-]+$`, safe)
		assert.NotContains(t, safe, "--")
		assert.LessOrEqual(t, len(safe), 110)
		assert.Empty(t, seen[safe], "%q looks like %q", name, seen[safe])
		seen[safe] = name
	}
}

// A stranger wrote our marker first. Their comment is left as it is, and ours
// stands beside it.
func TestAStrangersCommentIsNeverTouched(t *testing.T) {
	fake := mark + "**Gate open:** all is well"
	for name, o := range map[string]struct {
		as     apitest.User
		places []Place
	}{
		"app, with check":    {apitest.Bot("github-actions"), []Place{Check, Comment}},
		"app, comment alone": {apitest.Bot("github-actions"), []Place{Comment}},
		"person":             {apitest.Person("keeper"), []Place{Comment}},
		"person, with check": {apitest.Person("keeper"), []Place{Check, Comment}},
	} {
		t.Run(name, func(t *testing.T) {
			s := apitest.New(t, apitest.Options{As: o.as})
			strange := s.AddComment(214, apitest.Person("stranger"), fake)
			h, _ := patient(t, s)
			p := posting()
			p.Places = o.places
			post(t, h, p)
			p.Statement = statement(4)
			post(t, h, p)
			all := s.Comments(214)
			require.Len(t, all, 2)
			assert.Equal(t, strange, all[0])
			assert.Equal(t, o.as.Login, all[1].Author.Login)
			assert.Contains(t, all[1].Body, "rule 4")
			assert.Zero(t, s.Count("DELETE", ""))
		})
	}
}

// A check tells which app we are, so that not even another app's comment is
// taken for ours.
func TestAnotherAppsCommentIsNotOurs(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	other := s.AddComment(214, apitest.Bot("echo"), mark+"**Gate open:** said somebody")
	h, _ := patient(t, s)
	post(t, h, posting())
	post(t, h, posting())
	all := s.Comments(214)
	require.Len(t, all, 2)
	assert.Equal(t, other, all[0])
	assert.Zero(t, s.Count("GET", "/user"), "nobody has to be asked")
}

func TestALoginThatIsGivenIsBelieved(t *testing.T) {
	s := apitest.New(t, apitest.Options{As: apitest.Person("Keeper")})
	old := s.AddComment(214, apitest.Person("Keeper"), mark+"old")
	h, _ := patient(t, s, func(o *Options) { o.Login = "keeper" })
	p := posting()
	p.Places = []Place{Comment}
	post(t, h, p)
	assert.Equal(t, old.ID, only(t, s).ID)
	assert.Equal(t, 2, h.Calls())
}

// The marker counts in the first line alone: a bot that quotes what people
// write does not begin with it.
func TestAQuotedMarkerIsNoMarker(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.AddComment(214, apitest.Bot("github-actions"), "somebody wrote:\n"+mark+"open")
	h, _ := patient(t, s)
	post(t, h, posting())
	assert.Len(t, s.Comments(214), 2)
	assert.Equal(t, "somebody wrote:\n"+mark+"open", s.Comments(214)[0].Body)
}

func TestWhereEditingIsRefusedAnOwnCommentIsMade(t *testing.T) {
	s := apitest.New(t, apitest.Options{OwnOnly: true})
	other := s.AddComment(214, apitest.Bot("echo"), mark+"other")
	h, _ := patient(t, s)
	p := posting()
	p.Places = []Place{Comment} // nothing says which app we are
	post(t, h, p)
	p.Statement = statement(4)
	post(t, h, p)
	all := s.Comments(214)
	require.Len(t, all, 2)
	assert.Equal(t, other, all[0])
	assert.Contains(t, all[1].Body, "rule 4")
	assert.Equal(t, 1, s.Count("POST", "comments"))
}

func TestACommentDeletedMeanwhileIsMadeAgain(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, _ := patient(t, s)
	post(t, h, posting())
	s.Plant(apitest.Fault{Method: "PATCH", Path: "comments", Status: 404, Times: 1})
	p := posting()
	p.Statement = statement(4)
	post(t, h, p)
	assert.Equal(t, 2, s.Count("POST", "comments"))
	assert.Contains(t, only(t, s).Body, "rule 4")
}

func TestOursIsFoundOnALaterPage(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	for range 150 {
		s.AddComment(214, apitest.Person("pilot"), "chatter")
	}
	mine := s.AddComment(214, apitest.Bot("github-actions"), mark+"old")
	for range 100 {
		s.AddComment(214, apitest.Person("pilot"), "more")
	}
	h, _ := patient(t, s)
	post(t, h, posting())
	assert.Equal(t, mine.ID, only(t, s).ID)
	assert.Equal(t, 3, s.Count("GET", "comments"))
}

// Comments that are left from jobs which ran at the same time go away.
func TestDuplicatesOfOursAreDeleted(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	first := s.AddComment(214, apitest.Bot("github-actions"), mark+"first")
	s.AddComment(214, apitest.Bot("github-actions"), mark+"second")
	other := s.AddComment(214, apitest.Bot("echo"), mark+"other")
	h, _ := patient(t, s)
	post(t, h, posting())
	all := s.Comments(214)
	require.Len(t, all, 2)
	assert.Equal(t, first.ID, all[0].ID)
	assert.Contains(t, all[0].Body, "Gate closed")
	assert.Equal(t, other, all[1])
}

func TestADuplicateThatCannotBeDeletedIsTold(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.AddComment(214, apitest.Bot("github-actions"), mark+"first")
	s.AddComment(214, apitest.Bot("github-actions"), mark+"second")
	s.Refuse("DELETE", "comments")
	h, _ := patient(t, s)
	notices := h.Post(context.Background(), posting())
	require.Len(t, notices, 1)
	assert.Contains(t, notices[0].Text, "a second one could not be deleted")
	assert.Contains(t, s.Comments(214)[0].Body, "Gate closed")
}

// The host counts code points: so many characters of four bytes each fit.
func TestTheCommentFitsTheHost(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, _ := patient(t, s)
	p := posting()
	p.Places = append(p.Places, Summary)
	p.Runner = NewRunner(&strings.Builder{}, none)
	p.Statement = statement(2000)
	for n := range p.Statement.Rulings {
		p.Statement.Rulings[n].Name = strings.Repeat("𝒯", 40)
	}
	post(t, h, p)
	body := only(t, s).Body
	n := utf8.RuneCountInString(body)
	assert.LessOrEqual(t, n, mostComment)
	assert.Greater(t, n, mostComment-300)
	assert.Greater(t, len(body), mostComment)
	assert.Contains(t, body, "\n\nThe statement is longer than this page takes: it ends here, and goes on in [the summary of this run](https://harbour.example/harbour/tide-forecast/actions/runs/4242).\n")
}

// The marker counts too: what just fits beside it is left whole, and one
// character more is cut.
func TestTheMarkerTakesRoom(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, _ := patient(t, s)
	p := posting()
	p.Places = []Place{Comment}
	p.Markdown = strings.Repeat("潮\n", (mostComment-utf8.RuneCountInString(mark))/2)
	p.Markdown += strings.Repeat("潮", mostComment-utf8.RuneCountInString(mark+p.Markdown))
	post(t, h, p)
	assert.Equal(t, mark+p.Markdown, only(t, s).Body)
	assert.Equal(t, mostComment, utf8.RuneCountInString(only(t, s).Body))
	p.Markdown += "潮"
	post(t, h, p)
	assert.Contains(t, only(t, s).Body, "it ends here")
}

func none(string) string { return "" }
