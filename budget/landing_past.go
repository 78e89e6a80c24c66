package budget

import (
	"slices"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/forecast"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

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
func (j *judgement) merged(b *Budget, jobs []forecast.Job) []forecast.Job {
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
