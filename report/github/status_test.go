package github

import (
	"context"
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/report/github/apitest"
)

const runPage = "https://harbour.example/harbour/tide-forecast/actions/runs/4242"

func TestStatusesTellTheVerdict(t *testing.T) {
	for state, change := range map[string]func(*Posting){
		"failure Gate closed: retrain":              func(*Posting) {},
		"success Gate open: retrain":                func(p *Posting) { p.Statement.Gate = budget.Open },
		"pending Gate pending: retrain":             func(p *Posting) { p.Await = true },
		"success Report only. Gate closed: retrain": func(p *Posting) { p.ReportOnly = true },
		"failure Gate unknown: no policy":           func(p *Posting) { p.Statement, p.Trouble, p.ReportOnly = nil, "no policy", true },
	} {
		s := apitest.New(t, apitest.Options{})
		h, _ := patient(t, s)
		p := posting()
		p.Places = []Place{Status}
		change(&p)
		post(t, h, p)
		got := s.Statuses()
		require.Len(t, got, 1)
		assert.True(t, strings.HasPrefix(got[0].State+" "+got[0].Description, state), got)
		assert.Equal(t, []string{headSHA, "budgetcheck", runPage}, []string{got[0].SHA, got[0].Context, got[0].Target})
		assert.Equal(t, 1, h.Calls())
	}
}

func TestStatusesStandInForChecks(t *testing.T) {
	for name, plant := range map[string]func(*apitest.Server){
		"403 on reading":  func(s *apitest.Server) { s.Refuse("", "check-runs") },
		"403 on creating": func(s *apitest.Server) { s.Refuse("POST", "check-runs") },
		"404":             func(s *apitest.Server) { s.Plant(apitest.Fault{Path: "check-runs", Status: 404}) },
	} {
		t.Run(name, func(t *testing.T) {
			s := apitest.New(t, apitest.Options{})
			plant(s)
			h, _ := patient(t, s)
			post(t, h, posting())
			post(t, h, posting())
			assert.Empty(t, s.CheckRuns())
			require.Len(t, s.Statuses(), 2)
			assert.Equal(t, "failure", s.Statuses()[0].State)
			assert.Contains(t, only(t, s).Body, "Gate closed")
		})
	}
}

func TestTheStatusIsPostedOnce(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.Refuse("", "check-runs")
	h, _ := patient(t, s)
	p := posting()
	p.Places = []Place{Check, Status}
	post(t, h, p)
	assert.Len(t, s.Statuses(), 1)
}

func TestTheStatusFitsTheHost(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	h, _ := patient(t, s)
	p := posting()
	p.Places = []Place{Status}
	p.Statement.Reason = strings.Repeat("潮", 200)
	post(t, h, p)
	text := s.Statuses()[0].Description
	assert.Equal(t, mostDescription, utf8.RuneCountInString(text))
	assert.True(t, strings.HasSuffix(text, "潮..."))
	assert.Equal(t, "exactly", clipped("exactly", 7))
}

// The last status of a context counts, so that one may be posted twice.
func TestStatusesAreSentAgain(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	s.Plant(apitest.Fault{Path: "statuses", Status: 502, Done: true, Times: 2})
	h, _ := patient(t, s)
	p := posting()
	p.Places = []Place{Status}
	post(t, h, p)
	assert.Len(t, s.Statuses(), 3)
}

func TestNothingMayBeWritten(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	for _, path := range []string{"check-runs", "statuses"} {
		s.Refuse("POST", path)
	}
	s.Refuse("POST", "comments")
	h, _ := patient(t, s)
	notices := h.Post(context.Background(), posting())
	require.Len(t, notices, 2)
	for _, n := range notices {
		assert.False(t, n.Failed, "a fork is no failure")
		assert.Contains(t, n.Text, "the token may not add")
		assert.Contains(t, n.Text, "fork")
		assert.Contains(t, n.Text, "403")
	}
	assert.Equal(t, []Place{Status, Comment}, []Place{notices[0].Place, notices[1].Place})
}
