package forecast

import (
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// Run is a booked run that is evidence of what the next ones will take.
type Run struct {
	Start, End unit.Instant
	Facility   unit.Energy
	Embodied   unit.Mass
	Total      unit.Mass // as charged: operational and embodied
}

// Job is what is known of one job on the branch of a budget.
type Job struct {
	Name   string
	Past   []Run          // in order of start; the last 30 count
	Left   []unit.Instant // scheduled starts still to be expected, in order
	Rate   *Rate          // of a job without schedule, in place of Left; nil if it has one
	Zone   string         // of the grid that its next runs take
	Series *grid.Series   // of that zone; nil if there is none

	Ratio   float64 // head/base - 1 with the grid held, of a change as if it had merged; else 0
	RatioU  float64 // standard uncertainty of Ratio
	RatioDF float64 // degrees of freedom of RatioU; 0 if it is known exactly
}

// The runs of a job change with its code; only the last ones speak for the next.
const lastRuns = 30

// firing is a start that is to come; a run without schedule is spread over many.
type firing struct {
	at     unit.Instant
	weight float64 // runs
}

// firings are the job's starts up to the end of a period.
func (j Job) firings(p Period, now unit.Instant) (firings []firing) {
	if j.Rate != nil {
		return j.unscheduled(max(p.From, now), p.To)
	}
	for _, at := range j.Left {
		firings = append(firings, firing{at, 1})
	}
	return firings
}

// unscheduled spreads the expected runs over the days left, at the times of day
// of past runs.
func (j Job) unscheduled(from, to unit.Instant) (firings []firing) {
	runs := j.Rate.expected(to.Sub(from))
	if to <= from || runs == 0 {
		return nil
	}
	for _, r := range j.Past {
		ahead := (r.Start.Sub(from)%unit.Day + unit.Day) % unit.Day
		for at := from.Add(ahead); at < to; at = at.Add(unit.Day) {
			firings = append(firings, firing{at: at})
		}
	}
	if len(firings) == 0 { // less than a day is left, without one of their times
		firings = []firing{{at: from}}
	}
	for n := range firings {
		firings[n].weight = runs / float64(len(firings))
	}
	return firings
}

// length is the mean time from start to end.
func length(past []Run) unit.Duration {
	var seconds unit.Sum[float64]
	for _, r := range past {
		seconds.Add(max(r.End.Sub(r.Start).Seconds(), 0))
	}
	return unit.Duration(seconds.Value() / float64(len(past)) * float64(unit.Second))
}

// runs is how many runs the firings stand for.
func runs(firings []firing) float64 {
	var sum unit.Sum[float64]
	for _, f := range firings {
		sum.Add(f.weight)
	}
	return sum.Value()
}
