package budget

import (
	"fmt"
	"slices"

	"budgetcheck/budget/compare"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// byJob groups runs by job and stage, in order of first start.
func byJob(runs []*footprint.Run) (groups [][]*footprint.Run) {
	at := map[[2]string]int{}
	for _, r := range runs {
		k := [2]string{r.Job, r.Stage}
		if _, ok := at[k]; !ok {
			at[k] = len(groups)
			groups = append(groups, nil)
		}
		groups[at[k]] = append(groups[at[k]], r)
	}
	return groups
}

// changes compares head with base, job by job. Only runs that show what their
// code does, and whose evidence is not in doubt, take part; others are named.
func (j *judgement) changes() []Change {
	changes := []Change{}
	if len(j.base) == 0 && j.c.Books == nil {
		return changes
	}
	of := func(runs []*footprint.Run, job, stage string) []*footprint.Run {
		return slices.DeleteFunc(slices.Clone(runs), func(r *footprint.Run) bool {
			return r.Job != job || r.Stage != stage || !j.s.comparable(r)
		})
	}
	groups := byJob(slices.Concat(j.base, j.head))
	for _, group := range groups {
		p := pair{job: group[0].Job, stage: group[0].Stage}
		p.base, p.head = of(j.base, p.job, p.stage), of(j.head, p.job, p.stage)
		changes = append(changes, j.change(p))
	}
	return changes
}

// comparable tells whether the run is evidence in a comparison.
func (s *Statement) comparable(r *footprint.Run) bool {
	reason := noEvidence(r)
	if reason != "" {
		s.Notes = append(s.Notes, fmt.Sprintf("%s run %s takes no part in the comparison: %s", r.Side, r.Run, reason))
	}
	return reason == ""
}

// change compares one job and stage, by the first rule that asks for its total
// with the grid held, else to see any rise at all.
func (j *judgement) change(p pair) Change {
	c := Change{Job: p.job, Stage: p.stage, BaseRuns: len(p.base), HeadRuns: len(p.head)}
	c.Base, c.Head = meanTotal(p.base), meanTotal(p.head)
	switch {
	case c.Head != nil && c.Base == nil && j.isNew(p):
		c.Change, c.Bridge = c.Head, j.bridge(p)
		return c
	case c.Base == nil || c.Head == nil:
		return c
	}
	d := *c.Head - *c.Base
	c.Change, c.Bridge = &d, j.bridge(p)
	out := compare.Compare(samples(p.base), samples(p.head), j.questionOf(p))
	c.BaseHeld, c.HeadHeld, c.HeldRatio = as[unit.Mass](out.BaseHeld), as[unit.Mass](out.HeadHeld), out.Ratio
	c.LowRatio, c.HighRatio, c.Detectable = out.Low, out.High, out.Detectable
	if out.RunsNeeded > 0 {
		c.RunsNeeded = &out.RunsNeeded
	}
	if out.Confidence != nil {
		share := float64(*out.Confidence)
		c.Confidence = &share
	}
	c.ratioU, c.ratioDF = out.RatioU, out.DF
	j.noteBaseNoise(p, out)
	return c
}

// isNew tells whether the job has never run on the branch, as far as the books
// reach: then all of it is this change's. Without books nobody knows.
func (j *judgement) isNew(p pair) bool {
	first := p.head[0].Start
	return j.c.Books != nil && !slices.ContainsFunc(before(j.c.Books.account[j.c.Branch], first), func(part *footprint.Part) bool {
		return part.Open.Job == p.job && part.Open.Stage == p.stage
	})
}

// noteBaseNoise names base runs that stand out, and a base that drifts.
func (j *judgement) noteBaseNoise(p pair, out compare.Result) {
	for _, n := range out.Outliers {
		j.s.note(fmt.Sprintf("base run %s of job %s is far from the others; it counts all the same", p.base[n].Run, p.job))
	}
	if out.Drift {
		j.s.note(fmt.Sprintf("drift: the base runs of job %s rise or fall with time; head is compared with where their line stands by now", p.job))
	}
}

// questionOf is what is asked of a pair in the table of changes.
func (j *judgement) questionOf(p pair) compare.Question {
	q := compare.Question{Confidence: defaultConfidence, Shared: j.shared(p)}
	for _, g := range j.policy.Regressions {
		if matches(g.Branch, j.c.Branch) && g.covers(p.job, p.stage) && g.Measure == "total" && g.Grid == "hold" {
			return g.question(len(j.pairs(g)), q.Shared)
		}
	}
	return q
}

func samples(runs []*footprint.Run) (s []compare.Sample) {
	for _, r := range runs {
		w := r.Whole()
		one := compare.Sample{Machine: w.Machine, Facility: w.Facility, Operational: w.Operational, Embodied: w.Embodied, Variance: w.Variance}
		if r.Work != nil {
			one.Work = unit.Work{Amount: w.Work, Unit: r.Work.Unit}
		}
		s = append(s, one)
	}
	return s
}

// meanTotal is the mean of what the runs' whole work takes; nil without runs.
func meanTotal(runs []*footprint.Run) *unit.Mass {
	if len(runs) == 0 {
		return nil
	}
	var all []unit.Mass
	for _, r := range runs {
		all = append(all, r.Whole().Total())
	}
	m := mean(all)
	return &m
}

// totals are the known totals of the runs.
func totals(runs []*footprint.Run) (t []unit.Mass) {
	for _, r := range runs {
		if r.Total != nil {
			t = append(t, *r.Total)
		}
	}
	return t
}

func mean(values []unit.Mass) unit.Mass {
	var sum unit.Sum[unit.Mass]
	for _, v := range values {
		sum.Add(v)
	}
	return sum.Value() / unit.Mass(len(values))
}

func extremes(values []unit.Mass) (low, high unit.Mass) {
	return slices.Min(values), slices.Max(values)
}
