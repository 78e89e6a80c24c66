package github

import (
	"context"
	"fmt"
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/report/github/apitest"
)

// checking posts to the check alone.
func checking() Posting {
	p := posting()
	p.Places = []Place{Check}
	return p
}

func TestTheCheckTellsTheVerdict(t *testing.T) {
	for name, c := range map[string]struct {
		change             func(*Posting)
		status, conclusion string
		title              string
	}{
		"closed":       {func(*Posting) {}, "completed", "failure", "Gate closed: retrain is over by 1.2 kg: 26.2 kg of 25 kg"},
		"open":         {func(p *Posting) { p.Statement.Gate = budget.Open }, "completed", "success", "Gate open: retrain"},
		"waiting":      {func(p *Posting) { p.Await = true }, "in_progress", "", "Gate pending: retrain"},
		"report only":  {func(p *Posting) { p.ReportOnly = true }, "completed", "neutral", "Report only. Gate closed: retrain"},
		"not judged":   {func(p *Posting) { p.Statement, p.Trouble = nil, "a.toml:3: bad\nb" }, "completed", "failure", "Gate unknown: a.toml:3: bad; b"},
		"never hidden": {func(p *Posting) { p.Statement, p.ReportOnly = nil, true }, "completed", "failure", "Gate unknown: "},
	} {
		t.Run(name, func(t *testing.T) {
			s := apitest.New(t, apitest.Options{})
			h, _ := patient(t, s)
			p := checking()
			c.change(&p)
			post(t, h, p)
			got := s.CheckRuns()
			require.Len(t, got, 1)
			assert.Equal(t, []string{"budgetcheck", headSHA, c.status, c.conclusion}, []string{got[0].Name, got[0].HeadSHA, got[0].Status, got[0].Conclusion})
			assert.True(t, strings.HasPrefix(got[0].Title, c.title), got[0].Title)
			assert.Contains(t, got[0].Summary, "**Gate ")
			assert.Equal(t, "https://harbour.example/harbour/tide-forecast/actions/runs/4242", got[0].Details)
		})
	}
}

func TestAnnotationsMarkThePolicy(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, _ := patient(t, s)
	p := checking()
	p.Statement = statement(5)
	p.Statement.Rulings[4].State = budget.Waived
	post(t, h, p)
	message := ", observed 26.2 kg, limit 25 kg: because"
	assert.Equal(t, []apitest.Annotation{
		{Path: "budgetcheck.toml", Level: "failure", Title: "rule 1, job retrain-tide", Message: "over" + message, Line: 10},
		{Path: "budgetcheck.toml", Level: "warning", Title: "rule 2, job retrain-tide", Message: "unproven" + message, Line: 20},
		{Path: "budgetcheck.toml", Level: "notice", Title: "rule 3, job retrain-tide", Message: "near" + message, Line: 30},
	}, s.CheckRuns()[0].Annotations)
}

func TestRulesThatAreNowhereAreNotMarked(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, _ := patient(t, s)
	p := checking()
	p.Line = func(r budget.Ruling) (string, int) {
		if r.State == budget.Over {
			return "", 7
		}
		return "deep/budgetcheck.toml", 0 // of the file as a whole
	}
	post(t, h, p)
	got := s.CheckRuns()[0].Annotations
	require.Len(t, got, 2)
	assert.Equal(t, 1, got[0].Line)
	p.Line, p.Commit = nil, baseSHA
	post(t, h, p)
	assert.Empty(t, s.CheckRuns()[1].Annotations)
}

// many makes all rulings count.
func many(n int) *budget.Statement {
	s := statement(n)
	for i := range s.Rulings {
		s.Rulings[i].State = budget.Over
	}
	return s
}

func requireAll(t *testing.T, c apitest.CheckRun, n int) {
	t.Helper()
	require.Len(t, c.Annotations, n)
	for i, a := range c.Annotations {
		require.Equal(t, fmt.Sprintf("rule %d, job retrain-tide", i+1), a.Title)
	}
}

func TestAnnotationsGoInBatches(t *testing.T) {
	for _, n := range []int{0, 1, 49, 50, 51, 100, 101, 173} {
		s := apitest.New(t, apitest.Options{})
		h, _ := patient(t, s)
		p := checking()
		p.Statement = many(n)
		post(t, h, p)
		requireAll(t, s.CheckRuns()[0], n)
		assert.Equal(t, 1, s.Count("POST", "check-runs"))
		assert.Equal(t, max(0, (n+49)/50-1), s.Count("PATCH", "check-runs"), n)

		post(t, h, p)
		require.Len(t, s.CheckRuns(), 1, "the same again changes the check that is there")
		requireAll(t, s.CheckRuns()[0], n)
	}
}

// Wherever the answer to a request is lost, each annotation is there once.
func TestNoAnnotationIsLostOrDoubled(t *testing.T) {
	for skip := range 4 {
		for name, f := range map[string]apitest.Fault{
			"done, 502": {Status: 502, Done: true}, "done, dropped": {Drop: true, Done: true}, "done, garbage": {Status: 200, Body: "<html>", Done: true},
			"not done, 502": {Status: 502}, "not done, dropped": {Drop: true}, "limited": {Status: 403, Header: map[string]string{"Retry-After": "1"}},
		} {
			t.Run(fmt.Sprint(name, " ", skip), func(t *testing.T) {
				s := apitest.New(t, apitest.Options{})
				f.Times = 1
				if f.Path = "check-runs"; skip > 0 {
					f.Method, f.Skip = "PATCH", skip-1
				} else {
					f.Method = "POST"
				}
				s.Plant(f)
				h, _ := patient(t, s)
				p := checking()
				p.Statement = many(173)
				post(t, h, p)
				require.Len(t, s.CheckRuns(), 1)
				requireAll(t, s.CheckRuns()[0], 173)
			})
		}
	}
}

func TestAWaitingCheckIsCompleted(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, _ := patient(t, s)
	p := checking()
	p.Await = true
	post(t, h, p)
	post(t, h, p)
	require.Len(t, s.CheckRuns(), 1)
	assert.Empty(t, s.CheckRuns()[0].Annotations)
	p.Await = false
	post(t, h, p)
	got := s.CheckRuns()
	require.Len(t, got, 1)
	assert.Equal(t, []string{"completed", "failure"}, []string{got[0].Status, got[0].Conclusion})
	assert.Len(t, got[0].Annotations, 3)
	p.Await = true
	post(t, h, p)
	got = s.CheckRuns()
	require.Len(t, got, 2, "a conclusion cannot be taken back, so that a new check waits")
	assert.Equal(t, "in_progress", got[1].Status)
}

// The host would show the annotations of both statements on one check.
func TestOtherAnnotationsGoOnANewCheck(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, _ := patient(t, s)
	p := checking()
	post(t, h, p)
	p.Statement.Rulings[0].ObservedText = "24 kg"
	post(t, h, p)
	got := s.CheckRuns()
	require.Len(t, got, 2)
	assert.Len(t, got[1].Annotations, 3)
	assert.Contains(t, got[1].Annotations[0].Message, "24 kg")
	post(t, h, p)
	assert.Len(t, s.CheckRuns(), 2)
}

func TestChecksOfOthersAreLeftAlone(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	for _, c := range []apitest.CheckRun{
		{Name: "budgetcheck", HeadSHA: headSHA, App: "github-actions", Status: "in_progress"},                                            // a job called so
		{Name: "budgetcheck", HeadSHA: headSHA, App: "other", Status: "in_progress", External: "budgetcheck:budgetcheck:0.000000000000"}, // another app
		{Name: "budgetcheck", HeadSHA: headSHA, App: "third", Status: "in_progress", External: "budgetcheck:other:0.000000000000"},
	} {
		s.AddCheckRun(c)
	}
	before := s.CheckRuns()
	h, _ := patient(t, s)
	post(t, h, checking())
	got := s.CheckRuns()
	require.Len(t, got, 4)
	assert.Equal(t, before, got[:3])
	post(t, h, checking())
	assert.Len(t, s.CheckRuns(), 4)
}

func TestEachCommitAndEachNameHasItsCheck(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, _ := patient(t, s)
	for _, p := range []Posting{{Name: "a", Commit: headSHA}, {Name: "a", Commit: baseSHA}, {Name: "b", Commit: headSHA}, {Name: "a", Commit: headSHA}} {
		p.Places, p.Statement = []Place{Check}, statement(1)
		post(t, h, p)
	}
	var seen []string
	for _, c := range s.CheckRuns() {
		seen = append(seen, c.Name+" "+c.HeadSHA[:2])
	}
	assert.Equal(t, []string{"a a1", "a b2", "b a1"}, seen)
}

// Of the check's text, the host has been seen to count the bytes.
func TestTheCheckFitsTheHost(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, _ := patient(t, s)
	p := checking()
	p.Name = strings.Repeat("n", 300)
	p.Statement = many(2000)
	p.Statement.Reason = strings.Repeat("潮", 900)
	for n := range p.Statement.Rulings {
		p.Statement.Rulings[n].Name = strings.Repeat("潮", 900)
	}
	p.Statement.Rulings = p.Statement.Rulings[:60]
	post(t, h, p)
	got := s.CheckRuns()[0]
	assert.LessOrEqual(t, len(got.Summary), mostCheckText)
	assert.Greater(t, len(got.Summary), mostCheckText/2)
	assert.Contains(t, got.Summary, "goes on in [the statement.md of this run](https://")
	assert.Equal(t, mostTitle, utf8.RuneCountInString(got.Title))
	assert.Equal(t, mostTitle, utf8.RuneCountInString(got.Annotations[0].Title))
	assert.Equal(t, mostName, len(got.Name))
	post(t, h, p)
	assert.Len(t, s.CheckRuns(), 1)
}

func TestAFailingCheckIsTold(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.Plant(apitest.Fault{Path: "check-runs", Status: 503})
	h, _ := patient(t, s)
	notices := h.Post(context.Background(), posting())
	require.Len(t, notices, 1)
	assert.Equal(t, Check, notices[0].Place)
	assert.True(t, notices[0].Failed)
	assert.Contains(t, notices[0].Text, "503")
	assert.Empty(t, s.Statuses(), "a host in trouble is no host without checks")
	assert.Contains(t, only(t, s).Body, "Gate closed", "the comment does not wait for the check")
}
