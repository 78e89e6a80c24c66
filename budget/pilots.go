package budget

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/stat/distuv"

	"budgetcheck/budget/compare"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/forecast"
	"budgetcheck/budget/unit"
)

// project works out what all the work of a pilot would take, if it started at
// the job's next scheduled start. What cannot be projected is in doubt.
func (p *Policy) project(r *footprint.Run, j *Job, now unit.Instant) {
	doubt := func(reason string, price bool) {
		r.Doubt(footprint.Doubt{Price: price, Reason: fmt.Sprintf("run %s is a pilot, and what its whole work would take cannot be told: %s", r.Run, reason)})
	}
	if r.Facility == nil {
		return // what is missing is in doubt already
	}
	start := j.nextStart(r.Start, now)
	var whole footprint.Whole
	var variance float64
	for _, part := range r.Pieces {
		ratio := p.planned(r, j) / r.Work.Done
		if part.Work == nil {
			doubt(fmt.Sprintf("%s has no work lines", part.File), false)
			return
		}
		out, reason := projectPart(part, part.Work.Done*ratio)
		if reason != "" {
			doubt(reason, false)
			return
		}
		price, ok := part.MeanPrice(p.Method(), start, out.length)
		if !ok {
			doubt("its next hours have no intensity, measured or expected", true)
			return
		}
		whole.Machine += out.Energy
		whole.Facility += part.FacilityOf(out.Energy)
		whole.Operational += price.Of(part.FacilityOf(out.Energy))
		whole.Embodied += part.EmbodiedOver(out.length)
		whole.HalfWidth += part.FacilityOf(out.HalfWidth) // parts work in step: their errors add
		whole.Duration = max(whole.Duration, out.length)
		variance += float64(out.StdErr)
	}
	whole.Work = p.planned(r, j)
	whole.Variance = math.Pow(variance/float64(whole.Machine), 2)
	r.Project(&whole)
}

// planned is how much the run, or its job, plans.
func (p *Policy) planned(r *footprint.Run, j *Job) float64 {
	if j.Work != nil {
		return max(r.Work.Planned, j.Work.Amount)
	}
	return r.Work.Planned
}

// projected is a part's projection, and how long it would take.
type projected struct {
	compare.Projection
	length unit.Duration
}

// projectPart projects one part up to so much work.
func projectPart(part *footprint.Part, planned float64) (out projected, doubt string) {
	steps := part.MachineSteps()
	pilot := compare.Pilot{Planned: planned, Measured: part.MachineEnergy()}
	for _, s := range steps {
		pilot.Lines = append(pilot.Lines, compare.PilotLine{Done: s.Done, Energy: s.KWh})
	}
	if out.Projection, doubt = pilot.Project(); doubt != "" {
		return out, doubt
	}
	first, last := steps[0], steps[len(steps)-1]
	pace := (last.Elapsed - first.Elapsed).Seconds() / (last.Done - first.Done)
	out.length = part.End.Sub(part.Open.At) + unit.Duration(pace*(planned-last.Done)*float64(unit.Second))
	return out, ""
}

// nextStart is when the job is due next; its own start where it has no
// schedule.
func (j *Job) nextStart(own, now unit.Instant) unit.Instant {
	if j.Schedule == "" {
		return own
	}
	schedule, err := forecast.ParseSchedule(j.Schedule)
	if err != nil { // the policy was checked
		return own
	}
	const horizon = 8 * unit.Year // the 29th of February comes round in that
	for ahead := unit.Day; ahead <= horizon; ahead *= 4 {
		firings, err := schedule.Firings(now, now.Add(ahead))
		if err == nil && len(firings) > 0 {
			return firings[0]
		}
	}
	return own
}

// judgePilot judges a pilot by what its whole work would take, with the
// interval of the projection whatever the decision rule: a guess must not pass
// for a measurement.
func (j *judgement) judgePilot(b *Budget, run *footprint.Run) Ruling {
	r := b.ruling(j.c.Branch)
	r.Job = run.Job
	w := run.Projection
	value, half := float64(w.Total()), float64(w.Total95())
	if b.Limit.Energy != nil {
		value, half = float64(w.Facility), float64(w.HalfWidth)
	}
	if b.Limit.Rate != nil {
		value, half = value*b.Limit.Rate.Per/w.Work, half*b.Limit.Rate.Per/w.Work
	}
	a := amount{value: value, u: half / distuv.UnitNormal.Quantile(0.975), hasU: true}
	j.settle(&r, b, a)
	r.IntervalText = b.Limit.interval(value, half)
	r.State = decide(Guarded, value, half, b.Limit.base())
	if r.State == Within && b.warned(value) {
		r.State = Near
	}
	r.Reason = fmt.Sprintf("projected from a pilot that did %.3g of %.3g %s", run.Work.Done, w.Work, run.Work.Unit)
	return r
}

// warned tells whether a value is past the budget's warn_at.
func (b *Budget) warned(value float64) bool {
	return b.WarnAt != nil && value/b.Limit.base() > float64(*b.WarnAt)
}
