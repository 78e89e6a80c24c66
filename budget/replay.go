package budget

import (
	"cmp"
	"fmt"
	"runtime"
	"slices"
	"sync"
	"sync/atomic"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/forecast"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/unit"
)

// Replay is what a policy would have made of the past.
type Replay struct {
	Format  int            `json:"format"`
	Now     unit.Instant   `json:"now"`
	Branch  string         `json:"branch"`
	Policy  ReplayCounts   `json:"policy"`
	Beside  *ReplayCounts  `json:"beside,omitempty"` // by the policy that is tried
	Changes []ReplayChange `json:"changes"`
	Notes   []string       `json:"notes,omitempty"`
}

// ReplayCounts is how the past changes went by one policy.
type ReplayCounts struct {
	Source   string `json:"source"`
	Open     int    `json:"open"`
	Closed   int    `json:"closed"`   // by a ruling that is over
	Unproven int    `json:"unproven"` // closed by evidence alone
	// Days on which a budget over a period was over, and the gate of the branch
	// with it, by the name of the budget.
	Days map[string]int `json:"days_over,omitempty"`
}

// ReplayChange is one past change: the runs of a pull request or of a branch on
// one commit.
type ReplayChange struct {
	Commit  string       `json:"commit"`
	Pull    int          `json:"pull,omitempty"`
	At      unit.Instant `json:"at"`
	Gate    Gate         `json:"gate"`
	Reasons []string     `json:"reasons,omitempty"` // of a closed gate
	Beside  *ReplayGate  `json:"beside,omitempty"`  // by the policy that is tried, where it differs
}

// ReplayGate is the verdict of the policy that is tried.
type ReplayGate struct {
	Gate    Gate     `json:"gate"`
	Reasons []string `json:"reasons,omitempty"`
}

// Replayed is a policy to judge the past by.
type Replayed struct {
	Policy *Policy
	Set    *grid.Set
	Source string
}

// NewReplay judges every past change that the books tell of as of its own
// time: the end of its last run. Nothing that was booked for a later run is
// seen. beside is a policy to be tried; nil if there is none.
func NewReplay(read *ledger.Books, c Case, policy Replayed, beside *Replayed) *Replay {
	r := &Replay{Format: 1, Now: c.Now, Branch: c.Branch, Changes: []ReplayChange{}}
	past, without := pastChanges(read, c)
	if without > 0 {
		r.Notes = append(r.Notes, fmt.Sprintf("%d parts of runs tell no commit and belong to no change", without))
	}
	verdicts := policy.judge(read, c, past)
	r.Policy = policy.count(read, c, verdicts)
	var tried []*Statement
	if beside != nil {
		tried = beside.judge(read, c, past)
		counts := beside.count(read, c, tried)
		r.Beside = &counts
	}
	for n, p := range past {
		change := ReplayChange{Commit: p.commit, Pull: p.pull, At: p.at, Gate: verdicts[n].Gate, Reasons: closing(verdicts[n])}
		if beside != nil && (tried[n].Gate != change.Gate || !slices.Equal(closing(tried[n]), change.Reasons)) {
			change.Beside = &ReplayGate{tried[n].Gate, closing(tried[n])}
		}
		r.Changes = append(r.Changes, change)
	}
	return r
}

// Differences is the replay with only those changes that go otherwise by the
// policy beside it; nil where there are no past changes at all.
func (r *Replay) Differences() *Replay {
	if len(r.Changes) == 0 {
		return nil
	}
	d := *r
	d.Changes = slices.DeleteFunc(slices.Clone(r.Changes), func(c ReplayChange) bool { return c.Beside == nil })
	return &d
}

// pastChange is a commit in an account, at the end of its last run on a day.
type pastChange struct {
	commit string
	pull   int
	at     unit.Instant
}

// pastChanges finds the changes: of pull requests one for each commit, of the
// branch one for each commit and day, for a branch is judged every night.
func pastChanges(read *ledger.Books, c Case) (changes []pastChange, without int) {
	type key struct {
		account, commit string
		day             unit.Instant
	}
	at := map[key]unit.Instant{}
	for _, e := range read.Entries {
		pull := ledger.Pull(e.Account)
		k := key{account: e.Account, commit: e.Commit}
		switch {
		case e.End > c.Now || pull == 0 && e.Account != c.Branch:
			continue
		case e.Commit == "":
			without++
			continue
		case pull == 0:
			k.day = e.End / unit.Instant(unit.Day)
		}
		at[k] = max(at[k], e.End)
	}
	for k, t := range at {
		changes = append(changes, pastChange{k.commit, ledger.Pull(k.account), t})
	}
	slices.SortFunc(changes, func(a, b pastChange) int {
		return cmp.Or(cmp.Compare(a.at, b.at), cmp.Compare(a.pull, b.pull), cmp.Compare(a.commit, b.commit))
	})
	return changes, without
}

// judge judges the changes by one policy, several at once: none sees another.
func (p *Replayed) judge(read *ledger.Books, c Case, past []pastChange) []*Statement {
	books := p.Policy.Books(read, p.Set)
	read.Spent(ledger.Window{}) // makes the index, which must not be made twice at once
	verdicts := make([]*Statement, len(past))
	var next atomic.Int64
	var all sync.WaitGroup
	for range runtime.GOMAXPROCS(0) {
		all.Go(func() {
			for n := next.Add(1) - 1; n < int64(len(past)); n = next.Add(1) - 1 {
				change := past[n]
				verdicts[n] = p.Policy.Judge(Case{Branch: c.Branch, Pull: change.pull, HeadCommit: change.commit, Now: change.at,
					PolicySource: p.Source, Repository: c.Repository, Tags: c.Tags, Books: books, Past: true})
			}
		})
	}
	all.Wait()
	return verdicts
}

// count tells how the changes went, and on how many days periods were over.
func (p *Replayed) count(read *ledger.Books, c Case, verdicts []*Statement) ReplayCounts {
	n := ReplayCounts{Source: p.Source}
	for _, s := range verdicts {
		switch {
		case s.Gate == Open:
			n.Open++
		case s.count()[Over] > 0:
			n.Closed++
		default:
			n.Unproven++
		}
	}
	n.Days = p.daysOver(read, c)
	return n
}

// closing are the reasons that closed a gate.
func closing(s *Statement) (reasons []string) {
	if s.Gate == Open {
		return nil
	}
	for _, r := range s.Rulings {
		if r.State == Over || r.State == Unproven && !s.warns {
			reasons = append(reasons, r.headline(func(text string) string { return text }))
		}
	}
	return reasons
}

// daysOver counts for each budget over a period the days at whose end it was
// over.
func (p *Replayed) daysOver(read *ledger.Books, c Case) map[string]int {
	days := map[string]int{}
	if len(read.Entries) == 0 {
		return days
	}
	where := p.Policy.location()
	day, err := forecast.Holding("day", read.Entries[0].Start, where)
	for ; err == nil && day.From < c.Now; day, err = day.Next(where) {
		then := c
		then.Now, then.Books = min(day.To-1, c.Now), &Books{ledger: read}
		j := judgement{policy: p.Policy, c: &then}
		for _, b := range p.Policy.Budgets {
			if j.overNow(b) {
				days[b.Name]++
			}
		}
	}
	return days
}

// overNow tells whether a budget over a period is over by what was used by now.
func (j *judgement) overNow(b *Budget) bool {
	if !matches(b.Branch, j.c.Branch) || b.Per == "run" || b.Per == "pull" || b.Limit.Rate != nil {
		return false
	}
	w := j.window(j.span(b))
	w.Known = 0 // a run over midnight is booked in the morning, and was spent the day before
	var t tally
	t.booked(b, j.c.Books.ledger.Spent(w), j.policy.Method())
	return j.state(b, t.amount(b.Limit, footprint.Declared{})) == Over
}
