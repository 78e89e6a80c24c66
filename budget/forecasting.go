package budget

import (
	"fmt"

	"budgetcheck/budget/forecast"
	"budgetcheck/budget/unit"
)

// Forecast is where the periods of budgets will end, as it stands.
type Forecast struct {
	Format   int          `json:"format"`
	Now      unit.Instant `json:"now"`
	Branch   string       `json:"branch"`
	Landings []Landing    `json:"landings"`
	Job      string       `json:"job,omitempty"`  // whose next run was asked for
	Fits     *bool        `json:"fits,omitempty"` // the next run of Job fits every budget; absent if it is not known
	Reasons  []string     `json:"reasons,omitempty"`
}

// Forecast lands the periods of all budgets of a branch, the current and the
// next whole one. With a job it tells whether its next run fits.
func (p *Policy) Forecast(c Case, job string) *Forecast {
	f := &Forecast{Format: 1, Now: c.Now, Branch: c.Branch, Job: job, Landings: []Landing{}}
	j := judgement{policy: p, c: &c, s: &Statement{}, standing: newStanding(p, &c)}
	for _, b := range p.Budgets {
		if !matches(b.Branch, c.Branch) || b.Per == "run" || b.Per == "pull" || b.Limit.Rate != nil {
			continue
		}
		b = j.lifted(b)
		s := j.span(b)
		if !s.ends { // nobody knows when the next release is: only one more run can be told
			if job != "" && j.concerns(b, job) {
				t := j.carried(b, s)
				j.affordable(f, b, t.amount(b.Limit, j.declared()).value, "since "+s.opened)
			}
			continue
		}
		l := j.land(b, s, s.To)
		l.State = j.standingAt(b, &l)
		f.Landings = append(f.Landings, l)
		if next, err := s.Next(p.location()); err == nil {
			then := j.land(b, span{Period: next, account: s.account, ends: true}, s.To)
			then.State = j.standingAt(b, &then)
			f.Landings = append(f.Landings, then)
		}
		if job != "" && j.concerns(b, job) {
			j.affordable(f, b, l.figure.spent, "in "+l.Period)
		}
	}
	return f
}

// lifted is the budget with the extra of a waiver in force.
func (j *judgement) lifted(b *Budget) *Budget {
	w := j.waiver(b.Name, true)
	if w == nil {
		return b
	}
	lifted := *b
	lifted.Limit = b.Limit.plus(*w.Extra)
	return &lifted
}

// concerns tells whether runs of a job are charged to the budget.
func (j *judgement) concerns(b *Budget, name string) bool {
	for _, job := range j.policy.Jobs {
		if job.Name == name && matches(b.Job, name) && (job.Stage == "" || matches(b.Stage, job.Stage)) {
			return true
		}
	}
	return false
}

// standingAt is the state of a period as it stands: what is spent can be over,
// what is only expected is near.
func (j *judgement) standingAt(b *Budget, l *Landing) State {
	limit, f := b.Limit.base(), l.figure
	switch {
	case f.spent > limit:
		return Over
	case f.expected == nil:
		return Unproven
	case *f.expected > limit, b.WarnAt != nil && limit > 0 && *f.expected/limit > float64(*b.WarnAt):
		return Near
	}
	return Within
}

// affordable tells whether one more run of the job, now, fits what is left of
// the period.
func (j *judgement) affordable(f *Forecast, b *Budget, spent float64, period string) {
	fits := true
	next := j.nextRun(b, f.Job)
	limit := b.Limit.base()
	switch {
	case spent >= limit:
		fits = false
		f.Reasons = append(f.Reasons, fmt.Sprintf("%s has spent %s of %s %s", b.Name, b.Limit.text(spent), b.Limit, period))
	case next == nil:
		f.Reasons = append(f.Reasons, fmt.Sprintf("no past run of %s tells what its next one takes of %s", f.Job, b.Name))
		return
	case spent+*next > limit:
		fits = false
		f.Reasons = append(f.Reasons, fmt.Sprintf("the next run of %s takes about %s; %s has %s left of %s %s",
			f.Job, b.Limit.text(*next), b.Name, b.Limit.text(limit-spent), b.Limit, period))
	}
	if f.Fits == nil || *f.Fits {
		f.Fits = &fits
	}
}

// nextRun is what one run of the job takes if it starts now, in the limit's
// base unit; nil if no past run tells.
func (j *judgement) nextRun(b *Budget, name string) *float64 {
	for _, job := range j.policy.Jobs {
		if job.Name != name || job.Stage != "" && !matches(b.Stage, job.Stage) {
			continue
		}
		past := j.past(b, job)
		one := []forecast.Job{{Name: name, Past: past.runs, Zone: past.zone, Series: past.series, Left: []unit.Instant{j.c.Now}}}
		s := span{Period: forecast.Period{Per: b.Per, From: j.c.Now, To: j.c.Now.Add(unit.Day)}}
		return j.landed(b, s, &tally{}, one).expected
	}
	return nil
}
