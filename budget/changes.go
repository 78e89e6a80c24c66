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
func (s *Statement) changes(base, head []*footprint.Run) []Change {
	changes := []Change{}
	if len(base) == 0 {
		return changes
	}
	of := func(runs []*footprint.Run, job, stage string) []*footprint.Run {
		return slices.DeleteFunc(slices.Clone(runs), func(r *footprint.Run) bool { return r.Job != job || r.Stage != stage || !s.comparable(r) })
	}
	for _, group := range byJob(slices.Concat(base, head)) {
		job, stage := group[0].Job, group[0].Stage
		changes = append(changes, change(job, stage, of(base, job, stage), of(head, job, stage)))
	}
	return changes
}

// comparable tells whether the run is evidence in a comparison.
func (s *Statement) comparable(r *footprint.Run) bool {
	reason := ""
	switch {
	case !r.Outcome.Evidence():
		reason = fmt.Sprintf("its outcome is %s", r.Outcome)
	case len(r.Doubts) > 0:
		reason = r.Doubts[0].Reason
	case r.Total == nil:
		reason = "its total is not known"
	default:
		return true
	}
	s.Notes = append(s.Notes, fmt.Sprintf("%s run %s takes no part in the comparison: %s", r.Side, r.Run, reason))
	return false
}

func change(job, stage string, base, head []*footprint.Run) Change {
	c := Change{Job: job, Stage: stage, BaseRuns: len(base), HeadRuns: len(head)}
	if len(base) > 0 {
		m := mean(totals(base))
		c.Base = &m
	}
	if len(head) > 0 {
		m := mean(totals(head))
		c.Head = &m
	}
	if c.Base == nil || c.Head == nil {
		return c
	}
	d := *c.Head - *c.Base
	c.Change = &d
	if h, ok := compare.Hold(samples(base), samples(head)); ok {
		c.BaseHeld, c.HeadHeld, c.HeldRatio = &h.Base, &h.Head, &h.Ratio
	}
	return c
}

func samples(runs []*footprint.Run) (s []compare.Sample) {
	for _, r := range runs {
		one := compare.Sample{Machine: *r.MachineKWh, Facility: *r.Facility, Operational: *r.Operational}
		if r.Embodied != nil {
			one.Embodied = *r.Embodied
		}
		s = append(s, one)
	}
	return s
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
