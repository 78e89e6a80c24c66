package budget

import (
	"fmt"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// verdictOn is what one budget makes of the change.
type verdictOn struct {
	ruling   Ruling
	account  *AccountLine // nil where there is none to show
	landings []Landing
	due      bool // there is something to rule on
}

// perPeriod judges a budget over time. A change that is not on the branch yet
// is judged by where the period lands with it; what is on the branch by what
// the period has spent.
func (j *judgement) perPeriod(b *Budget) verdictOn {
	switch {
	case b.Per == "pull" && j.c.Pull == 0:
		return verdictOn{}
	case j.c.Books == nil:
		return j.withoutBooks(b)
	case b.Per == "pull" || !j.c.prospective():
		return j.spending(b)
	case b.Per == "release":
		return j.beforeMerge(b)
	}
	return j.landing(b)
}

// withoutBooks: what the period has spent is not known. What the head runs
// alone spend is known all the same.
func (j *judgement) withoutBooks(b *Budget) verdictOn {
	r := b.ruling(j.c.Branch)
	s := j.span(b)
	t := j.headTally(b, s)
	if a := t.proven(b.Limit, j.declared()); b.Limit.Rate == nil && j.charged(b) && j.state(b, a) == Over {
		j.settle(&r, b, a)
		r.Reason = "what the head runs are proven to emit passes the limit"
		return verdictOn{ruling: r, due: true}
	}
	r.State, r.Reason = Unproven, fmt.Sprintf("no ledger is given, so what the %s has spent is not known; add -ledger", b.Per)
	return verdictOn{ruling: r, due: true}
}

// charged tells whether the head runs are charged to the budget's account.
func (j *judgement) charged(b *Budget) bool { return b.Per == "pull" || !j.c.prospective() }

func (j *judgement) declared() footprint.Declared { return j.policy.Method().Uncertainty }

// headTally adds up the head runs that are charged to the span.
func (j *judgement) headTally(b *Budget, s span) *tally {
	var t tally
	for _, r := range j.head {
		if b.covers(r.Job, r.Stage) {
			t.run(r, j.policy, s, func(p *footprint.Part) bool {
				account, _ := j.entered(p)
				return account == s.account || account == "" && j.charged(b)
			})
		}
	}
	return &t
}

// entered is the account that a part is booked to, given or not, and whether it
// is booked at all. Whatever a given part says, one of its name in the books is
// what was charged.
func (j *judgement) entered(p *footprint.Part) (account string, booked bool) {
	if p.Account != "" {
		return p.Account, true
	}
	if j.c.Books == nil {
		return "", false
	}
	if in := j.c.Books.key[keyOf(p)]; in != nil && in.End <= j.c.Now {
		return in.Account, true
	}
	return "", false
}

// spending judges what an account has spent, this change included.
func (j *judgement) spending(b *Budget) verdictOn {
	s := j.span(b)
	if b.Limit.Rate != nil {
		return j.rateOver(b, s)
	}
	all, change := j.carried(b, s), j.headTally(b, s)
	r := b.ruling(j.c.Branch)
	j.ruleSum(&r, b, all)
	if r.Reason == "" && s.opened != "" {
		r.Reason = "since " + s.opened
	}
	v := verdictOn{ruling: r, account: j.accountOf(b, s, r, all, change), due: true}
	if s.ends {
		j.lands(b, s, &v)
	}
	return v
}

// lands shows where the period lands as it stands. It closes no gate: nothing
// is spent yet.
func (j *judgement) lands(b *Budget, s span, v *verdictOn) {
	l := j.land(b, s, s.To)
	l.State = j.standingAt(b, &l)
	v.landings = []Landing{l}
	if v.ruling.State == Within && l.State == Near && *l.figure.expected > b.Limit.base() {
		v.ruling.State, v.ruling.Reason = Near, fmt.Sprintf("%s lands at %s", l.Period, or(l.interval(), l.expected()))
		if v.account != nil {
			v.account.State = Near
		}
	}
}

// carried is all that an account spent in the span: what is booked, and the
// charged parts of head runs that are not.
func (j *judgement) carried(b *Budget, s span) *tally {
	all := j.booked(b, s)
	for _, r := range j.head {
		if !b.covers(r.Job, r.Stage) {
			continue
		}
		ours := false
		for _, p := range r.Pieces {
			account, booked := j.entered(p)
			ours = ours || account == s.account || !booked && j.charged(b)
		}
		if !ours {
			continue
		}
		all.settled(r)
		if j.charged(b) {
			all.run(r, j.policy, s, func(p *footprint.Part) bool { _, booked := j.entered(p); return !booked })
		}
		all.examine(b.Limit, r, s)
	}
	return all
}

// booked is what the books tell of a span. Lines of them that cannot be read
// may be about it.
func (j *judgement) booked(b *Budget, s span) *tally {
	var t tally
	t.booked(b, j.c.Books.ledger.Spent(j.window(s)), j.policy.Method())
	if found := &j.c.Books.ledger.Findings; found.Len() > 0 {
		t.unread = fmt.Sprintf("the ledger has lines that cannot be read (%d), first %s", found.Len(), found.First())
	}
	return &t
}

// ruleSum rules on a sum. What is proven to be spent is spent.
func (j *judgement) ruleSum(r *Ruling, b *Budget, t *tally) {
	j.settle(r, b, t.amount(b.Limit, j.declared()))
	doubt := t.doubt()
	if doubt == "" {
		if r.State == Unproven {
			r.Reason = byLess
		}
		return
	}
	if proven := t.proven(b.Limit, j.declared()); j.state(b, proven) == Over {
		j.settle(r, b, proven)
		r.Reason = "what is proven to be spent passes the limit; " + doubt
		return
	}
	r.State, r.Reason, r.Conformance = Unproven, doubt, nil
}

// byLess is the reason of guarded rulings whose value lies in the guard band.
const byLess = "above the limit, but by less than its expanded uncertainty"

// rateOver judges a rate over the runs that ended in the span: the sum of
// their emissions by the sum of their work.
func (j *judgement) rateOver(b *Budget, s span) verdictOn {
	r := b.ruling(j.c.Branch)
	sum := &footprint.Run{}
	var mass unit.Sum[unit.Mass]
	for _, run := range j.runsIn(b, s) {
		if reason := b.Limit.unfit(run); reason != "" || !run.Known() {
			r.State, r.Reason = Unproven, or(reason, "the evidence of run "+run.Run+" is in doubt")
			return verdictOn{ruling: r, due: true}
		}
		mass.Add(*run.Total)
		if sum.Work == nil {
			sum.Work = &record.Work{Unit: run.Work.Unit}
		}
		sum.Work.Done += run.Work.Done
		sum.Terms.Mass = sum.Terms.Mass.Plus(1, run.Terms.Mass)
	}
	if sum.Work == nil {
		return verdictOn{}
	}
	total := mass.Value()
	sum.Total = &total
	a, _ := b.Limit.of(sum, j.declared())
	j.settle(&r, b, a)
	if r.State == Unproven {
		r.Reason = byLess
	}
	return verdictOn{ruling: r, due: true}
}

// runsIn are the runs of a budget's account that ended in the span, booked and
// given, each once.
func (j *judgement) runsIn(b *Budget, s span) (runs []*footprint.Run) {
	until := min(s.To, j.c.Now)
	parts := before(j.c.Books.account[s.account], until)
	booked, _ := j.policy.Runs(parts)
	seen := map[[2]any]bool{}
	for _, r := range append(append([]*footprint.Run{}, j.head...), booked...) {
		k := [2]any{r.Run, r.Attempt}
		account, in := j.entered(r.Pieces[0])
		if seen[k] || !b.covers(r.Job, r.Stage) || in && account != s.account || !in && !j.charged(b) || r.End <= s.From || r.End > until {
			continue
		}
		seen[k] = true
		runs = append(runs, r)
	}
	return runs
}

// beforeMerge judges a period whose end is not known, for a change that is not
// charged to it yet: only what others have spent can be told.
func (j *judgement) beforeMerge(b *Budget) verdictOn {
	s := j.span(b)
	t := j.booked(b, s)
	r := b.ruling(j.c.Branch)
	j.settle(&r, b, t.amount(b.Limit, j.declared()))
	r.Reason = "since " + s.opened + "; this change is charged after merge"
	if r.State == Over || r.State == Unproven {
		r.State, r.Reason, r.Conformance = Near, overBefore, nil
	}
	return verdictOn{ruling: r, account: j.accountOf(b, s, r, t, nil), due: true}
}

// overBefore is the reason where others have spent what there was.
const overBefore = "over before this change"

// accountOf shows a mass budget as an account; change is nil where nothing of
// this change is charged to it.
func (j *judgement) accountOf(b *Budget, s span, r Ruling, all, change *tally) *AccountLine {
	if b.Limit.Mass == nil {
		return nil
	}
	a := &AccountLine{Name: b.Name, Per: b.Per, Period: s.Name, Limit: *b.Limit.Mass, State: r.State}
	carried := all.mass.Value()
	a.Brought = &carried
	if change != nil {
		c := change.mass.Value()
		brought := max(carried-c, 0)
		if brought < carried*1e-12 { // rounding of the difference
			brought = 0
		}
		a.Brought, a.Change, a.Carried = &brought, &c, &carried
		a.Page = page(b, j.head, true)
	}
	return a
}
