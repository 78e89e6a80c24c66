package budget_test

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/compare"
	"budgetcheck/budget/inputs"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// trees are commits a, b and so on with a file each; head and base by letter.
func (s *scene) trees(head, base string, named map[string]string) *scene {
	c := &budget.Commits{Head: tree(head), Named: map[string]inputs.Tree{}}
	if base != "" {
		c.Base = tree(base)
	}
	for letter, content := range named {
		c.Named[strings.Repeat(letter, 40)] = tree(content)
	}
	s.about.Commits = c
	return s
}

// sides are the names of a side's runs, in order of start.
func sideOf(st *budget.Statement, side string) (names []string) {
	for _, r := range st.Runs {
		if r.Side == side {
			names = append(names, r.Run)
		}
	}
	return names
}

// Head runs of a pull request stand for its head commit: on that commit, or with
// its inputs, in whatever account, of whatever age. Others do not.
func TestHeadRunsOfPullRequest(t *testing.T) {
	s := inPull(creeping(""), 5)
	s.trees("new", "old", map[string]string{"a": "old", "b": "new", "c": "new", "d": "newer"})
	add := func(account, commit, run string, back int) {
		one := bookedNights(1, back, ranOn(commit))[0]
		one.open.Run, one.account = run, account
		s.books = append(s.books, one)
	}
	add("pull/7", "b", "h-own", 0)
	add("pull/7", "c", "h-inputs", 8) // an earlier push with the same files, 8 days ago
	add("pull/7", "d", "x-other", 7)
	add("pull/8", "b", "h-twin", 6)
	st := s.judge(t)
	assert.Equal(t, []string{"h-inputs", "h-twin", "h-own"}, sideOf(st, "head"))
	assert.NotContains(t, strings.Join(doubts(st), "\n"), "ended")
	s.about.Now = now.Add(40 * unit.Day)
	assert.Empty(t, doubts(s.judge(t)), "what the same inputs gave does not age")
}

// A commit with the head's files stands for it also where nobody knew its files
// when its run was booked: a change that takes another back.
func TestRevertedChange(t *testing.T) {
	s := inPull(creeping(""), 8)
	for n := range 4 {
		s.books[n].open.Commit = strings.Repeat("c", 40)
	}
	s.trees("first", "second", map[string]string{"a": "second", "b": "first", "c": "first"})
	st := s.judge(t)
	assert.Len(t, sideOf(st, "head"), 4, "%v", doubts(st))
}

// Base runs are those with the merge base's inputs, filled up with earlier
// ones: what came onto the target branch later is not what the change left.
func TestBaseRunsOfMergeBase(t *testing.T) {
	s := inPull(creeping("base_runs = 8"), 12, night())
	for n := range s.books {
		letter, by := "z", 1.0 // before
		if n >= 4 {
			letter = "a" // the merge base
		}
		if n >= 8 {
			letter, by = "y", 3 // after it
		}
		ranOn(letter)(&s.books[n].sketch)
		s.books[n].sketch = scaledOf(s.books[n].sketch, by)
	}
	s.trees("new", "old", map[string]string{"a": "old", "b": "new", "y": "later", "z": "older"})
	st := s.judge(t)
	assert.Equal(t, []string{"b12", "b11", "b10", "b9", "b8", "b7", "b6", "b5"}, sideOf(st, "base"))
	assert.Contains(t, strings.Join(st.Notes, "\n"), "fill the base up: b12, b11, b10, b9")
	// A rule that asks for fewer takes those of the merge base first.
	s.policy += "\n[[regression]]\nname = \"few\"\nbranch = \"main\"\nmax_rise = \"5%\"\nbase_runs = 4\n"
	r := ruling(t, s.judge(t), "few")
	assert.InDelta(t, 0, *r.Observed, 1e-9)
	assert.Contains(t, r.Reason, "from 4 base")
}

// Failed and cancelled nights are no base, nor is one that had not ended or
// started when the head run did.
func TestOutcomesOfBase(t *testing.T) {
	s := inPull(creeping(""), 9, night())
	for n, outcome := range []record.Outcome{record.OK, record.Stopped, record.Failed, record.Cancelled, ""} {
		s.books[n].outcome = outcome
	}
	later := bookedNights(1, 0, ranOn("a"), later(3*unit.Hour))
	s.books = append(s.books, later...)
	assert.Equal(t, []string{"b9", "b8", "b4", "b3", "b2", "b1"}, sideOf(s.judge(t), "base"))
	s.policy = creeping("base_runs = 3")
	assert.Equal(t, []string{"b3", "b2", "b1"}, sideOf(s.judge(t), "base"))
}

// A push is judged by its last nights: what ended longer ago than max_age is
// base, whatever the commit.
func TestHeadRunsOfPush(t *testing.T) {
	s := sceneOf().onCommit("a")
	s.policy, s.books = creeping(""), bookedNights(8, 0, ranOn("a"))
	st := s.judge(t)
	assert.Equal(t, []string{"b2", "b1", "b0"}, sideOf(st, "head"), "ended 11 h, 35 h and 59 h ago")
	assert.Equal(t, []string{"b7", "b6", "b5", "b4", "b3"}, sideOf(st, "base"))
	s.onCommit("f") // a commit that no run stands for
	st = s.judge(t)
	assert.Equal(t, budget.Closed, st.Gate)
	assert.Contains(t, strings.Join(doubts(st), "\n"), "required")
}

// sumOf adds up a bridge.
func sumOf(b *compare.Bridge) (sum float64) {
	for _, part := range []*unit.Mass{b.Work, b.Efficiency, b.Energy, b.Site, b.Grid, b.Embodied} {
		if part != nil {
			sum += float64(*part)
		}
	}
	return sum
}

// A job that is new on the branch is all work and embodied, however its run is
// known: from a file, from the pull request's account, from the branch's own.
func TestNewJob(t *testing.T) {
	for account, pull := range map[string]int{"": 7, "pull/7": 7, "main": 0} {
		s := inPull(creeping(""), 5)
		s.about.Pull = pull
		s.policy = edit(t, s.policy, "meters = 4\n", "meters = 4\nembodied = \"1000 kg\"\nlifetime = \"4y\"\n") + "\n[[job]]\nname = \"score-tide\"\n"
		fresh := night(scored, ranOn("b"), func(s *sketch) { s.watts = []float64{100, 100, 100, 101} })
		s.head = []sketch{fresh, night(ranOn("b"))}
		if account != "" {
			s.books = append(s.books, bookedAs(account, fresh))
			s.head = s.head[1:]
		}
		found := false
		for _, c := range s.judge(t).Changes {
			if c.Job == "score-tide" {
				found = true
				if assert.NotNil(t, c.Bridge, "booked to %q", account) {
					assert.InDelta(t, 40.1, grams(t, c.Bridge.Work), 1e-9)
					assert.InDelta(t, 6250/219., grams(t, c.Bridge.Embodied), 1e-9)
					assert.InDelta(t, 40.1+6250/219., grams(t, c.Change), 1e-9)
				}
			}
		}
		require.True(t, found)
	}
}

// The bridge of a change adds up to it, with K of NUMBERS 5: W 1000 to 1100, E
// 100 to 126.5, PUE 1.2 to 1.14, I 400 to 500.
func TestBridgeOfChange(t *testing.T) {
	s := inPull(creeping(""), 4, night(scaled(126.5), func(s *sketch) { s.open.Site, s.work = "quay-south", []record.Work{{Unit: "step", Done: 1100}} }))
	s.books[0].sketch, s.books[1].sketch = scaledOf(s.books[0].sketch, 80), scaledOf(s.books[1].sketch, 120)
	s.books[2].sketch, s.books[3].sketch = scaledOf(s.books[2].sketch, 90), scaledOf(s.books[3].sketch, 110)
	s.policy = edit(t, s.policy, "zone = \"NORTH\"\npue = 1.0", "zone = \"NORTH\"\npue = 1.2", "zone = \"SOUTH\"\npue = 1.0", "zone = \"SOUTH\"\npue = 1.14")
	s.series = edit(t, allYear, "100,average", "400,average", "200,average", "500,average")
	c := s.judge(t).Changes[0]
	assert.InDelta(t, 24105, grams(t, c.Change), 1e-6)
	require.NotNil(t, c.Bridge)
	assert.InDelta(t, 5645.92, grams(t, c.Bridge.Work), 0.005)
	assert.InDelta(t, 8279.13, grams(t, c.Bridge.Efficiency), 0.005)
	assert.InDelta(t, -3038.48, grams(t, c.Bridge.Site), 0.005)
	assert.InDelta(t, -24018.68+31928.72+5308.39, grams(t, c.Bridge.Grid), 0.01)
	assert.InDelta(t, 24105, sumOf(c.Bridge), 1e-6)
	require.NotNil(t, c.Bridge.Parts)
	assert.InDelta(t, float64(*c.Bridge.Grid), float64(c.Bridge.Parts.Zone+c.Bridge.Parts.Day+c.Bridge.Parts.Hour), 1e-6)
}
