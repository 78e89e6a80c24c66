package budget

import (
	"context"
	"slices"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/unit"
)

// How far back the books are read: past runs for comparing and landing, first
// lately and, where that is too little, further; not beyond a year, for older
// runs say little about the next.
const (
	lately   = 62 * unit.Day
	farthest = 400 * unit.Day
)

// Consult reads from a ledger what judging a case takes.
func (p *Policy) Consult(ctx context.Context, store ledger.Store, c *Case, set *grid.Set) (*Books, error) {
	q := consulting{ctx: ctx, store: store, policy: p, c: c, standing: newStanding(p, c)}
	read, err := q.read()
	if err != nil {
		return nil, err
	}
	return p.Books(read, set), nil
}

// Notes are what reading the ledger had to say: lines that cannot be read, and
// what was settled without loss.
func (b *Books) Notes() []string {
	return slices.Concat(b.ledger.Findings.Lines(), b.ledger.Notes)
}

// consulting is the state of reading a ledger.
type consulting struct {
	ctx      context.Context
	store    ledger.Store
	policy   *Policy
	c        *Case
	standing *standing
	release  unit.Instant // before which runs are compared with; 0: no rule asks for that
}

// releaseBase is the last release of the branch, if a regression compares with
// the runs before it.
func (j *judgement) releaseBase() unit.Instant {
	asks := slices.ContainsFunc(j.policy.Regressions, func(r *Regression) bool { return r.Against == "release" && matches(r.Branch, j.c.Branch) })
	if m := j.lastRelease(j.c.Now); asks && m != nil {
		return m.At
	}
	return 0
}

func (q *consulting) read() (*ledger.Books, error) {
	marks, err := q.marks()
	if err != nil {
		return nil, err
	}
	j := judgement{policy: q.policy, c: &Case{Branch: q.c.Branch, Pull: q.c.Pull, Now: q.c.Now, Repository: q.c.Repository, Tags: q.c.Tags,
		Books: &Books{ledger: &ledger.Books{Marks: marks}}}}
	windows := j.windows()
	q.release = j.releaseBase()
	var read *ledger.Books
	if sums, ok := q.store.(ledger.Summing); ok {
		read, err = q.summed(sums, windows, j.wholePeriods())
	} else {
		read, err = q.whole(windows)
	}
	if err != nil {
		return nil, err
	}
	read.Marks = marks
	return read, nil
}

// marks are the releases of the branch, if any rule counts from one.
func (q *consulting) marks() ([]*ledger.Mark, error) {
	if !q.policy.NeedsTags(q.c.Branch) {
		return nil, nil
	}
	read, err := q.store.Read(q.ctx, ledger.Query{Repository: q.c.Repository, OnlyMarks: true})
	if err != nil {
		return nil, err
	}
	return read.Marks, nil
}

// NeedsTags tells whether a rule of the branch counts from the last release.
func (p *Policy) NeedsTags(branch string) bool {
	return slices.ContainsFunc(p.Budgets, func(b *Budget) bool { return b.Per == "release" && matches(b.Branch, branch) }) ||
		slices.ContainsFunc(p.Regressions, func(r *Regression) bool { return r.Against == "release" && matches(r.Branch, branch) })
}

// NeedsBooks tells whether a rule of the branch asks for what was spent before.
func (p *Policy) NeedsBooks(branch string) bool {
	return slices.ContainsFunc(p.Budgets, func(b *Budget) bool { return b.Per != "run" && matches(b.Branch, branch) }) ||
		slices.ContainsFunc(p.Regressions, func(r *Regression) bool { return matches(r.Branch, branch) })
}

// Unplaced are the commits whose inputs decide whether booked runs stand for
// the head or the base of a change and that were not known when they were
// booked, newest run first: those of the pull request, and of the last runs on
// the branch.
func (b *Books) Unplaced(c *Case) (commits []string) {
	const most = 60
	take := func(parts []*footprint.Part, all bool) {
		parts = before(parts, c.Now)
		for n := len(parts) - 1; n >= max(0, len(parts)-most); n-- {
			id := parts[n].Open.Commit
			if id != "" && id != c.HeadCommit && (all || parts[n].Inputs == "") && !slices.Contains(commits, id) {
				commits = append(commits, id)
			}
		}
	}
	if c.Pull > 0 {
		take(b.account[ledger.PullAccount(c.Pull)], true)
	}
	take(b.account[c.Branch], false)
	return commits
}

// windows are the sums that budgets of the branch ask for.
func (j *judgement) windows() (windows []ledger.Window) {
	for _, b := range j.policy.Budgets {
		if matches(b.Branch, j.c.Branch) && b.Per != "run" && (b.Per != "pull" || j.c.Pull > 0) {
			windows = append(windows, j.window(j.span(b)))
		}
	}
	return windows
}

// wholePeriods are those of windows whose runs are needed one by one, for the
// sum of their work.
func (j *judgement) wholePeriods() (windows []ledger.Window) {
	for _, b := range j.policy.Budgets {
		if matches(b.Branch, j.c.Branch) && b.Per != "run" && b.Limit.Rate != nil && (b.Per != "pull" || j.c.Pull > 0) {
			windows = append(windows, j.window(j.span(b)))
		}
	}
	return windows
}

// summed reads from a store that adds up by itself: the sums, the newest runs
// of each job, those that may stand for the head, and those around them.
func (q *consulting) summed(sums ledger.Summing, windows, whole []ledger.Window) (*ledger.Books, error) {
	added := map[ledger.Window]ledger.Spending{}
	for _, w := range windows {
		s, err := sums.Spent(q.ctx, w)
		if err != nil {
			return nil, err
		}
		added[w] = s
	}
	c, since := q.c, q.c.Now.Add(-farthest)
	queries := []ledger.Query{{Accounts: []string{c.Branch}, Since: since, Last: lastRuns + max(lastRuns, q.policy.baseRuns(c.Branch))}}
	if q.release > 0 {
		queries = append(queries, ledger.Query{Accounts: []string{c.Branch}, Until: q.release, Last: 2 * q.policy.baseRuns(c.Branch)})
	}
	if c.Pull > 0 {
		queries = append(queries, ledger.Query{Accounts: []string{ledger.PullAccount(c.Pull)}})
	}
	if c.HeadCommit != "" {
		queries = append(queries, ledger.Query{Commits: []string{c.HeadCommit}, Inputs: q.headInputs(), Since: since})
	}
	for _, w := range whole {
		queries = append(queries, ledger.Query{Accounts: []string{w.Account}, Since: w.From, Until: w.To})
	}
	read, err := q.all(queries)
	if err != nil {
		return nil, err
	}
	if from, to, ok := q.headSpan(read); ok {
		around, err := q.all([]ledger.Query{{Since: from, Until: to}})
		if err != nil {
			return nil, err
		}
		read = ledger.Merge(read, around)
	}
	read.Added = added
	return read, nil
}

// all reads several queries into one.
func (q *consulting) all(queries []ledger.Query) (*ledger.Books, error) {
	var all []*ledger.Books
	for _, query := range queries {
		query.Repository = q.c.Repository
		read, err := q.store.Read(q.ctx, query)
		if err != nil {
			return nil, err
		}
		all = append(all, read)
	}
	return ledger.Merge(all...), nil
}

// headInputs are the hashes of the jobs' inputs at the head commit.
func (q *consulting) headInputs() (hashes []string) {
	for _, job := range q.policy.Jobs {
		if h := q.standing.headInputs(job); h != "" {
			hashes = append(hashes, h)
		}
	}
	return hashes
}

// headSpan is the time in which given head runs, and booked ones that may be
// head runs, were going on.
func (q *consulting) headSpan(read *ledger.Books) (from, to unit.Instant, ok bool) {
	take := func(start, end unit.Instant) {
		if !ok {
			from, to, ok = start, end, true
		}
		from, to = min(from, start), max(to, end)
	}
	for _, p := range q.c.Head {
		if p.Opened() {
			take(p.Open.At, p.End)
		}
	}
	inputs := q.headInputs()
	for _, e := range read.Entries {
		if q.c.HeadCommit != "" && e.Commit == q.c.HeadCommit || slices.Contains(inputs, e.Inputs) {
			take(e.Start, e.End)
		}
	}
	return from, to, ok
}

// whole reads all of the last months from a store of whole months, and further
// back where the jobs have too few runs there.
func (q *consulting) whole(windows []ledger.Window) (*ledger.Books, error) {
	now := q.c.Now
	since, limit := now.Add(-lately), now.Add(-farthest)
	if q.release > 0 {
		since, limit = min(since, q.release.Add(-lately)), min(limit, q.release.Add(-farthest))
	}
	for _, w := range windows {
		since = min(since, w.From)
	}
	for _, p := range q.c.Head {
		if p.Opened() {
			since = min(since, p.Open.At)
		}
	}
	for {
		read, err := q.store.Read(q.ctx, ledger.Query{Repository: q.c.Repository, Since: since})
		if err != nil || since <= limit || q.enough(read) {
			return read, err
		}
		since = max(now.Add(-2*now.Sub(since)), limit)
	}
}

// enough tells whether every job has as many runs on the branch as comparing
// and landing take.
func (q *consulting) enough(read *ledger.Books) bool {
	for _, job := range q.policy.Jobs {
		runs := map[string]bool{}
		for _, e := range read.Entries {
			if q.release > 0 && e.End > q.release {
				continue
			}
			if e.Account == q.c.Branch && e.Job == job.Name && (job.Stage == "" || e.Stage == job.Stage) && e.Outcome.Evidence() {
				runs[e.Run.Run] = true
			}
		}
		if len(runs) < max(lastRuns, q.policy.baseRuns(q.c.Branch)) {
			return false
		}
	}
	return true
}
