package budget

import (
	"fmt"

	"gonum.org/v1/gonum/stat/distuv"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// budgets rules on every budget of the branch that has something to judge.
func (j *judgement) budgets() {
	for _, b := range j.policy.Budgets {
		if !matches(b.Branch, j.c.Branch) {
			continue
		}
		v := j.judgeBudget(b)
		if !v.due {
			continue
		}
		v = j.waive(b, v)
		j.rule(v.ruling)
		if v.account != nil {
			j.s.Accounts = append(j.s.Accounts, *v.account)
		}
		j.s.Landings = append(j.s.Landings, v.landings...)
	}
}

// judgeBudget judges one budget, without waivers.
func (j *judgement) judgeBudget(b *Budget) verdictOn {
	if b.Per != "run" {
		return j.perPeriod(b)
	}
	r, due := j.perRun(b)
	return verdictOn{ruling: r, account: j.accountPerRun(b, r), due: due}
}

// ruling is an empty ruling of the budget.
func (b *Budget) ruling(branch string) Ruling {
	limit := b.Limit.shown(b.Limit.base())
	return Ruling{Kind: KindBudget, Name: b.Name, Branch: branch, Job: b.Job, Per: b.Per, Limit: &limit, Unit: b.Limit.unit(),
		LimitText: b.Limit.String(), PolicyLine: b.Line, PolicyFile: b.File}
}

// covers tells whether the budget is about the run.
func (b *Budget) covers(job, stage string) bool {
	return matches(b.Job, job) && matches(b.Stage, stage)
}

// perRun judges every run by itself; the worst is shown. due is false where no
// run matches and none has to: then there is nothing to rule on.
func (j *judgement) perRun(b *Budget) (r Ruling, due bool) {
	var w worst
	runs := 0
	for _, run := range j.head {
		if b.covers(run.Job, run.Stage) {
			runs++
			w.take(j.judgeRun(b, run))
		}
	}
	j.owed(&w, b.Job, b.Stage, b.ruling(j.c.Branch))
	return w.of(runs, "runs")
}

// worst is the worst of a rule's rulings: that is the one that is shown.
type worst struct {
	Ruling
	due bool // there is one
}

// take takes the next. What is shown hides nothing but missing records.
func (w *worst) take(r Ruling) {
	missing := w.Missing || w.State != Unproven
	if !w.due || r.worse(w.Ruling) {
		w.Ruling, w.due = r, true
	}
	w.Missing = w.Missing && missing && (r.Missing || r.State != Unproven)
}

// of says among how many the worst was found.
func (w *worst) of(n int, what string) (Ruling, bool) {
	if n > 1 && w.Observed != nil {
		w.Reason = joinReason(fmt.Sprintf("worst of %d %s", n, what), w.Reason)
	}
	return w.Ruling, w.due
}

// owed rules on the jobs that a rule is about and that need no run, or owe one.
// A job without a stage may run at any. empty is a ruling of the rule.
func (j *judgement) owed(w *worst, jobs, stages string, empty Ruling) {
	for _, job := range j.policy.Jobs {
		if !matches(jobs, job.Name) || job.Stage != "" && !matches(stages, job.Stage) {
			continue
		}
		r := empty
		r.Job = job.Name
		switch {
		case j.standing.unchanged(job):
			r.State, r.Reason = Within, unchanged
			w.take(r)
		case j.asked(job) && !j.satisfied(job):
			r.State = Unproven
			r.Reason, r.Missing = j.missing(job)
			w.take(r)
		}
	}
}

func joinReason(a, b string) string {
	if b == "" {
		return a
	}
	return a + "; " + b
}

// worse orders rulings of one budget by state, then by what was observed.
func (r Ruling) worse(o Ruling) bool {
	if r.State != o.State {
		return severity[r.State] < severity[o.State]
	}
	return r.Observed != nil && (o.Observed == nil || *r.Observed > *o.Observed)
}

// amount is a run's figure against a limit, in the limit's base unit.
type amount struct {
	value float64
	u     float64 // standard uncertainty; 0 where none is declared
	hasU  bool
}

// provenAlone is the reason where what is proven to be spent decides.
const provenAlone = "the measured, priced part alone passes the limit"

// judgeRun judges one run. Doubtful evidence leaves the ruling unproven, but
// what is proven to be spent is spent: where the measured, priced part alone
// passes the limit, the run is over however thin the rest.
func (j *judgement) judgeRun(b *Budget, run *footprint.Run) Ruling {
	r := b.ruling(j.c.Branch)
	r.Job = run.Job
	if reason := b.Limit.unfit(run); reason != "" {
		r.State, r.Reason = Unproven, reason
		return r
	}
	if run.Projection != nil && len(b.Limit.doubts(run)) == 0 {
		if proven := b.Limit.proven(run, j.declared()); b.Limit.Rate == nil && j.state(b, proven) == Over {
			j.settle(&r, b, proven)
			r.Reason = provenAlone
			return r
		}
		return j.judgePilot(b, run)
	}
	a, known := b.Limit.of(run, j.policy.Method().Uncertainty)
	if known {
		j.settle(&r, b, a)
	}
	doubts := b.Limit.doubts(run)
	if known && len(doubts) == 0 {
		if r.State == Unproven {
			r.Reason = byLess
		}
		return r
	}
	proven := b.Limit.proven(run, j.policy.Method().Uncertainty)
	if b.Limit.provable(run) && j.state(b, proven) == Over {
		j.settle(&r, b, proven)
		r.Reason = provenAlone
		return r
	}
	r.State, r.Reason, r.Conformance = Unproven, "the evidence is in doubt", nil
	if len(doubts) > 0 {
		r.Reason, r.Missing = doubts[0].Reason, onlyMissing(doubts)
	}
	return r
}

// settle writes what the amount makes of the limit.
func (j *judgement) settle(r *Ruling, b *Budget, a amount) {
	limit := b.Limit.base()
	r.State = j.state(b, a)
	observed := b.Limit.shown(a.value)
	r.Observed = &observed
	if limit > 0 {
		share := a.value / limit
		r.Share = &share
	}
	if a.hasU && a.u > 0 {
		conformance := distuv.UnitNormal.CDF((limit - a.value) / a.u)
		r.Conformance = &conformance
	}
	r.ObservedText, r.LimitText, r.ExcessText = b.Limit.texts(a.value)
	if a.hasU {
		r.IntervalText = b.Limit.interval(a.value, 2*a.u)
	}
}

// state applies the decision rule, with the expanded uncertainty U = 2u where
// it is guarded (JCGM 106:2012; ILAC-G8:09/2019), and warn_at. Exactly at the
// limit is within, and exactly at warn_at, for which shares are compared: a
// share of the limit would be rounded.
func (j *judgement) state(b *Budget, a amount) State {
	st := decide(j.policy.Account.Decision, a.value, 2*a.u, b.Limit.base())
	if st == Within && b.warned(a.value) {
		return Near
	}
	return st
}

// decide compares an estimate y with expanded uncertainty with a limit.
func decide(rule Decision, y, expanded, limit float64) State {
	if rule == Simple {
		expanded = 0
	}
	switch {
	case y+expanded <= limit:
		return Within
	case y <= limit:
		return Near
	case y-expanded <= limit:
		return Unproven
	}
	return Over
}

// accountPerRun shows a mass budget for each run; nil for other limits.
func (j *judgement) accountPerRun(b *Budget, r Ruling) *AccountLine {
	if b.Limit.Mass == nil {
		return nil
	}
	a := &AccountLine{Name: b.Name, Per: b.Per, Limit: *b.Limit.Mass, State: r.State}
	if r.Observed != nil {
		m := unit.Mass(*r.Observed)
		a.Change, a.Carried = &m, &m
	}
	a.Page = append(page(b, j.base, false), page(b, j.head, true)...)
	return a
}

// page lists the runs of one side by job and stage, at so much each.
func page(b *Budget, runs []*footprint.Run, head bool) (lines []PageLine) {
	for _, group := range byJob(runs) {
		first := group[0]
		if !b.covers(first.Job, first.Stage) {
			continue
		}
		totals := totals(group)
		if len(totals) == 0 {
			continue
		}
		line := PageLine{Job: first.Job, Stage: first.Stage, Head: head, Runs: len(totals), Each: mean(totals)}
		if len(totals) > 1 {
			low, high := extremes(totals)
			line.Low, line.High = &low, &high
		}
		lines = append(lines, line)
	}
	return lines
}
