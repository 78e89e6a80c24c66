package github

import (
	"context"
	"fmt"
	"sync"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/report/github/apitest"
)

// meet makes the first n calls wait for each other.
func meet(n int) func() {
	var mu sync.Mutex
	all, came := make(chan struct{}), 0
	return func() {
		mu.Lock()
		if came++; came == n {
			close(all)
		}
		mu.Unlock()
		<-all
	}
}

// Jobs that all see no comment and then all create one end with one: whatever
// they meet at, and whatever they know of who they are.
func TestJobsThatRaceEndWithOneComment(t *testing.T) {
	for name, c := range map[string]struct {
		o      apitest.Options
		places []Place
		at     apitest.Fault // where they wait for each other
	}{
		"before listing":  {apitest.Options{}, []Place{Check, Comment}, apitest.Fault{Method: "GET", Path: "comments"}},
		"before creating": {apitest.Options{}, []Place{Check, Comment}, apitest.Fault{Method: "POST", Path: "comments"}},
		"without check":   {apitest.Options{}, []Place{Comment}, apitest.Fault{Method: "POST", Path: "comments"}},
		"as a person":     {apitest.Options{As: apitest.Person("keeper")}, []Place{Comment}, apitest.Fault{Method: "POST", Path: "comments"}},
		"on a forge":      {apitest.Options{Forge: true}, []Place{Comment}, apitest.Fault{Method: "POST", Path: "comments"}},
	} {
		t.Run(name, func(t *testing.T) {
			const jobs = 4
			s := apitest.New(t, c.o)
			c.at.Before, c.at.Times = meet(jobs), jobs
			s.Plant(c.at)
			race(t, s, jobs, c.places)
			assert.Contains(t, only(t, s).Body, "Gate closed")
			if c.at.Method == "POST" { // all had listed by then
				assert.Equal(t, jobs, s.Count("POST", "comments"))
				assert.GreaterOrEqual(t, s.Count("DELETE", "comments"), jobs-1)
			}
		})
	}
}

func race(t *testing.T, s *apitest.Server, jobs int, places []Place) {
	t.Helper()
	var wait sync.WaitGroup
	told := make([][]Notice, jobs)
	for n := range jobs {
		h, _ := patient(t, s)
		p := posting()
		p.Places, p.Statement = places, statement(3+n)
		wait.Go(func() { told[n] = h.Post(context.Background(), p) })
	}
	wait.Wait()
	for n := range jobs {
		require.Empty(t, told[n], fmt.Sprint("job ", n))
	}
}

// One job edits what is there while another has just created a second one.
func TestAnEditMeetsACreation(t *testing.T) {
	s := apitest.New(t, apitest.Options{})
	late, _ := patient(t, s)
	s.Plant(apitest.Fault{Method: "POST", Path: "comments", Times: 1, Before: func() {
		// Between the list and the creation of one job, another job does all.
		early, _ := patient(t, s)
		post(t, early, posting())
	}})
	p := posting()
	p.Statement = statement(5)
	post(t, late, p)
	assert.Contains(t, only(t, s).Body, "rule 5")
	assert.Equal(t, 2, s.Count("POST", "comments"))
	assert.Equal(t, 1, s.Count("DELETE", "comments"))
}
