package budget

import (
	"fmt"
	"slices"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/forecast"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// Landing is where the period of a budget ends if runs go on as scheduled; of a
// change that is not on the branch yet, as if it had merged. Of a mass budget
// the figures in g are there, of an energy budget those in kWh.
type Landing struct {
	Name      string        `json:"name"`
	Per       string        `json:"per"`
	Period    string        `json:"period"`
	Spent     *unit.Mass    `json:"spent_g,omitempty"`
	Without   *unit.Mass    `json:"without_g,omitempty"` // expected without the change
	Expected  *unit.Mass    `json:"expected_g,omitempty"`
	Low       *unit.Mass    `json:"low_g,omitempty"` // 95 %
	High      *unit.Mass    `json:"high_g,omitempty"`
	Limit     *unit.Mass    `json:"limit_g,omitempty"`
	SpentE    *unit.Energy  `json:"spent_kwh,omitempty"`
	WithoutE  *unit.Energy  `json:"without_kwh,omitempty"`
	ExpectedE *unit.Energy  `json:"expected_kwh,omitempty"`
	LowE      *unit.Energy  `json:"low_kwh,omitempty"`
	HighE     *unit.Energy  `json:"high_kwh,omitempty"`
	LimitE    *unit.Energy  `json:"limit_kwh,omitempty"`
	RunsLeft  float64       `json:"runs_left"`
	RunsOutOn *unit.Instant `json:"runs_out_on,omitempty"`
	BurnRatio *float64      `json:"burn_ratio,omitempty"` // share spent / share of the time gone
	State     State         `json:"state"`
	Notes     []string      `json:"notes,omitempty"`

	Limits Limit        `json:"-"` // with units, for people
	figure landed       // in the limit's unit
	before *landed      // without the change
	jobs   []landingJob // for the page
}

// landed are the figures of a landing in the limit's base unit.
type landed struct {
	spent               float64
	expected, low, high *float64
	left                float64
	out                 *unit.Instant
	burn                *float64
	terms               []landingTerm
	notes               []string
}

type landingTerm struct {
	runs, expected float64
}

// landingJob is one job of a landing: its runs left at so much each, without
// and with the change.
type landingJob struct {
	Job          string
	Left         float64
	Before, With float64 // each, in the limit's unit
}

// landing judges a change by where the periods land with it: the one that runs
// and the next whole one; the worse counts.
func (j *judgement) landing(b *Budget) verdictOn {
	if b.Limit.Rate != nil {
		return j.rateBefore(b)
	}
	s := j.span(b)
	now := j.land(b, s, s.To)
	next := s
	if p, err := s.Next(j.policy.location()); err == nil {
		next.Period = p
	}
	then := j.land(b, next, s.To)
	r, worst := j.ruleLanding(b, &now), &now
	if later := j.ruleLanding(b, &then); later.worse(r) {
		r, worst = later, &then
	}
	return verdictOn{ruling: r, account: j.landingAccount(b, s, r, worst), landings: []Landing{now, then}, due: true}
}

// rateBefore: a rate does not land; what others did in the period is theirs.
func (j *judgement) rateBefore(b *Budget) verdictOn {
	v := j.rateOver(b, j.span(b))
	if v.ruling.State == Over || v.ruling.State == Unproven {
		v.ruling.State, v.ruling.Reason, v.ruling.Conformance = Near, overBefore, nil
	}
	return v
}

// land works out one period, without and with the change. Nothing but runs of
// the period itself is spent in it.
func (j *judgement) land(b *Budget, s span, current unit.Instant) Landing {
	l := Landing{Name: b.Name, Per: b.Per, Period: s.Name, Limits: b.Limit}
	spent := &tally{}
	switch {
	case s.To > current:
	case j.c.prospective():
		spent = j.booked(b, s)
	default:
		spent = j.carried(b, s)
	}
	jobs, notes := j.landingJobs(b, s)
	with := jobs
	if j.c.prospective() {
		with = j.merged(b, s, jobs)
		before := j.landed(b, s, spent, jobs)
		l.before = &before
	}
	l.figure = j.landed(b, s, spent, with)
	l.Notes = slices.Concat(notes, l.figure.notes)
	l.show(b.Limit, with)
	return l
}

// landed asks the forecast.
func (j *judgement) landed(b *Budget, s span, spent *tally, jobs []forecast.Job) landed {
	if b.Limit.Energy != nil {
		return figures(forecast.LandEnergy(forecast.Budget[unit.Energy]{Period: s.Period, Now: j.c.Now,
			Spent: spent.energy.Value(), Limit: *b.Limit.Energy, Jobs: jobs, Known: &j.c.Books.known}))
	}
	return figures(forecast.LandMass(forecast.Budget[unit.Mass]{Period: s.Period, Now: j.c.Now,
		Spent: spent.mass.Value(), Limit: *b.Limit.Mass, Jobs: jobs, Known: &j.c.Books.known}))
}

func figures[Q forecast.Quantity](l forecast.Landing[Q]) landed {
	number := func(q *Q) *float64 {
		if q == nil {
			return nil
		}
		v := float64(*q)
		return &v
	}
	f := landed{spent: float64(l.Spent), expected: number(l.Expected), low: number(l.Low), high: number(l.High),
		left: l.RunsLeft, out: l.RunsOutOn, burn: l.BurnRatio, notes: l.Notes}
	for _, t := range l.Terms {
		f.terms = append(f.terms, landingTerm{t.RunsLeft, float64(t.Expected)})
	}
	return f
}

// landingJobs are the jobs that are charged to the budget: those of the policy,
// with what the books tell of their past runs on the branch.
func (j *judgement) landingJobs(b *Budget, s span) (jobs []forecast.Job, notes []string) {
	for _, job := range j.policy.Jobs {
		if !matches(b.Job, job.Name) || job.Stage != "" && !matches(b.Stage, job.Stage) {
			continue
		}
		past := j.past(b, job)
		f := forecast.Job{Name: job.Name, Past: past.runs, Zone: past.zone, Series: past.series}
		switch left, err := j.left(job, s, past.starts); {
		case err != nil:
			notes = append(notes, err.Error())
		case job.Schedule != "":
			f.Left = left
		default:
			rate := forecast.RateOf(past.starts, past.opened, j.c.Now)
			f.Rate = &rate
		}
		jobs = append(jobs, f)
	}
	return jobs, notes
}

// left are the scheduled starts of a job that are still to be expected within
// the span.
func (j *judgement) left(job *Job, s span, starts []unit.Instant) ([]unit.Instant, error) {
	if job.Schedule == "" {
		return nil, nil
	}
	schedule, err := forecast.ParseSchedule(job.Schedule)
	if err != nil {
		return nil, err
	}
	from := s.From
	if j.c.Now > from { // no window is longer than the time since the period's start
		from = max(s.From, j.c.Now.Add(-28*unit.Day))
	}
	firings, err := schedule.Firings(from, s.To)
	if err != nil {
		return nil, err
	}
	return forecast.Left(firings, starts, j.c.Now, job.Window), nil
}

// pastRuns is what the books tell of a job on the branch.
type pastRuns struct {
	runs   []forecast.Run // evidence, in order of start
	starts []unit.Instant // of all runs of the last weeks, in order
	opened unit.Instant   // of the oldest run that the books tell of
	zone   string
	series *grid.Series
}

// pastKey is what the past runs of a job turn on.
type pastKey struct {
	job   *Job
	stage string // glob of the budget
}

// lastRuns is how many past runs speak for the next ones.
const lastRuns = 30

// past reads the job's runs on the branch, newest first, until there are
// enough and four weeks are covered.
func (j *judgement) past(b *Budget, job *Job) (past pastRuns) {
	k := pastKey{job, b.Stage}
	if known, ok := j.pasts[k]; ok {
		return known
	}
	defer func() {
		if j.pasts == nil {
			j.pasts = map[pastKey]pastRuns{}
		}
		j.pasts[k] = past
	}()
	all := before(j.c.Books.account[j.c.Branch], j.c.Now)
	past.opened = j.c.Now
	if len(all) > 0 {
		past.opened = all[0].Open.At
	}
	var parts []*footprint.Part
	since := j.c.Now.Add(-28 * unit.Day)
	seen := map[[2]any]bool{}
	for n := len(all) - 1; n >= 0; n-- {
		p := all[n]
		if p.Open.Job != job.Name || job.Stage != "" && p.Open.Stage != job.Stage || !matches(b.Stage, p.Open.Stage) || p.End > j.c.Now {
			continue
		}
		if len(seen) > lastRuns && p.Open.At < since {
			break
		}
		seen[[2]any{p.Open.Run, p.Open.Attempt}] = true
		parts = append(parts, p)
	}
	runs, _ := j.policy.Runs(parts)
	for _, r := range runs {
		j.policy.examineFacts(r, j.c.Now)
		past.starts = append(past.starts, r.Start)
		if one, ok := evidenceOf(r); ok {
			past.runs = append(past.runs, one)
			site := r.Pieces[0].Facts.Site
			past.zone, past.series = site.Zone, site.Series
		}
	}
	return past
}

// evidenceOf is a run as the forecast takes it; ok is false where it shows
// nothing of what the next will take.
func evidenceOf(r *footprint.Run) (one forecast.Run, ok bool) {
	w := r.Whole()
	if !r.Outcome.Evidence() || w == nil || len(r.Doubts) > 0 {
		return one, false
	}
	return forecast.Run{Start: r.Start, End: r.Start.Add(w.Duration), Facility: w.Facility, Embodied: w.Embodied, Total: w.Total()}, true
}

// merged is how the jobs go on if the change merges: each run takes as much
// more as the comparison shows. A job without a past goes by the head runs.
func (j *judgement) merged(b *Budget, s span, jobs []forecast.Job) []forecast.Job {
	with := slices.Clone(jobs)
	for n := range with {
		job := &with[n]
		ratio, u, df, ok := j.ratio(b, job.Name)
		switch {
		case ok && len(job.Past) > 0:
			job.Ratio, job.RatioU, job.RatioDF = ratio, u, df
		case len(job.Past) == 0:
			job.Past, job.Zone, job.Series = j.headRuns(b, job.Name)
			if rate := job.Rate; rate != nil && rate.Runs == 0 {
				job.Rate = nil // how often it will run is not known
			}
		}
	}
	return with
}

// headRuns are the head runs of a job as the forecast takes them.
func (j *judgement) headRuns(b *Budget, name string) (runs []forecast.Run, zone string, series *grid.Series) {
	for _, r := range j.head {
		if one, ok := evidenceOf(r); ok && r.Job == name && b.covers(r.Job, r.Stage) {
			runs = append(runs, one)
			zone, series = r.Pieces[0].Facts.Site.Zone, r.Pieces[0].Facts.Site.Series
		}
	}
	return runs, zone, series
}

// ratio is how much more the job takes with the change, with the grid held.
func (j *judgement) ratio(b *Budget, job string) (ratio, u, df float64, ok bool) {
	for _, c := range j.s.Changes {
		if c.Job == job && matches(b.Stage, c.Stage) && c.HeldRatio != nil {
			return *c.HeldRatio, c.ratioU, c.ratioDF, true
		}
	}
	return 0, 0, 0, false
}

// ruleLanding rules on one period, and notes the state in the landing. The
// change closes the gate only where it raises the landing and the policy says
// so; what others spent is near.
func (j *judgement) ruleLanding(b *Budget, l *Landing) Ruling {
	r := b.ruling(j.c.Branch)
	limit := b.Limit.base()
	f := l.figure
	if f.expected == nil {
		return j.landingUnknown(b, l, r)
	}
	u := 0.0
	if f.high != nil {
		u = (*f.high - *f.expected) / 2
	}
	j.settle(&r, b, amount{value: *f.expected, u: u, hasU: f.high != nil})
	r.IntervalText = l.interval()
	r.Reason = fmt.Sprintf("%s lands at %s with this change", l.Period, l.expected())
	raises := l.before == nil || l.before.expected == nil || *f.expected > *l.before.expected
	already := l.before != nil && l.before.expected != nil && *l.before.expected > limit
	closes := raises && b.Landing == "close"
	if already && closes && !j.surelyRaises(b) {
		closes = false
	}
	switch {
	case f.spent > limit:
		r.State, r.Reason = Near, overBefore
	case r.State == Over && already && !closes:
		r.State, r.Reason = Near, fmt.Sprintf("%s lands over the limit without this change too", l.Period)
	case (r.State == Over || r.State == Unproven) && !closes:
		r.State = Near
	}
	l.State = r.State
	return r
}

// landingUnknown: no run shows what the next ones will take.
func (j *judgement) landingUnknown(b *Budget, l *Landing, r Ruling) Ruling {
	r.State, r.Reason = Within, "the landing is not known: no past run shows what the next ones will take"
	if b.Landing == "close" {
		r.State = Unproven
	}
	if l.figure.spent > b.Limit.base() {
		r.State, r.Reason = Near, overBefore
	}
	l.State = r.State
	return r
}

// surelyRaises tells whether the change shows a rise that is more than noise,
// for any job of the budget.
func (j *judgement) surelyRaises(b *Budget) bool {
	return slices.ContainsFunc(j.s.Changes, func(c Change) bool {
		return b.covers(c.Job, c.Stage) && c.LowRatio != nil && *c.LowRatio > 0
	})
}
