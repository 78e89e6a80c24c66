package github

import (
	"context"
	"fmt"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/report/github/apitest"
)

const harbour = "harbour/tide-forecast"

// clock is a clock that stands still but for waits, which take no time.
type clock struct {
	mu    sync.Mutex
	at    time.Time
	waits []time.Duration
}

func (c *clock) now() time.Time {
	c.mu.Lock()
	defer c.mu.Unlock()
	return c.at
}

func (c *clock) sleep(_ context.Context, d time.Duration) error {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.at = c.at.Add(d)
	c.waits = append(c.waits, d)
	return nil
}

// patient is a client of a test server, with waits that take no time and no
// jitter.
func patient(t testing.TB, s *apitest.Server, change ...func(*Options)) (*Host, *clock) {
	t.Helper()
	c := &clock{at: time.Now()}
	o := Options{API: s.URL, Repository: harbour, Token: apitest.Token, Server: "https://harbour.example", RunID: "4242",
		Sleep: c.sleep, Jitter: func(d time.Duration) time.Duration { return d }}
	for _, f := range change {
		f(&o)
	}
	h, err := NewHost(o)
	require.NoError(t, err)
	h.wire.now = c.now
	return h, c
}

// posting asks to post a closed gate to the default places.
func posting() Posting {
	return Posting{Places: []Place{Comment, Check}, Name: "budgetcheck", Pull: 214, Commit: headSHA, Statement: statement(3),
		Line: func(r budget.Ruling) (string, int) { return "budgetcheck.toml", r.PolicyLine }}
}

// statement has so many rulings, the first over, the second unproven, the third
// near, the others within.
func statement(rulings int) *budget.Statement {
	s := &budget.Statement{Format: 1, Gate: budget.Closed, Reason: "retrain is over by 1.2 kg: 26.2 kg of 25 kg", Branch: "main", Pull: 214,
		HeadCommit: headSHA, BaseCommit: baseSHA, PolicySource: "budgetcheck.toml"}
	states := []budget.State{budget.Over, budget.Unproven, budget.Near}
	for n := range rulings {
		r := budget.Ruling{Kind: budget.KindBudget, Name: fmt.Sprint("rule ", n+1), Job: "retrain-tide", State: budget.Within, Reason: "because",
			ObservedText: "26.2 kg", LimitText: "25 kg", PolicyLine: 10 * (n + 1), PolicyFile: "budgetcheck.toml"}
		if n < len(states) {
			r.State = states[n]
		}
		s.Rulings = append(s.Rulings, r)
	}
	return s
}

// post posts, and nothing may go wrong.
func post(t testing.TB, h *Host, p Posting) {
	t.Helper()
	require.Empty(t, h.Post(context.Background(), p))
}

// only is the one comment on the pull request that has our marker.
func only(t testing.TB, s *apitest.Server) apitest.Comment {
	t.Helper()
	var ours []apitest.Comment
	for _, c := range s.Comments(214) {
		if strings.HasPrefix(c.Body, "<!-- budgetcheck:budgetcheck -->\n") {
			ours = append(ours, c)
		}
	}
	require.Len(t, ours, 1)
	return ours[0]
}
