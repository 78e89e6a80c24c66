package forecast

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/stat"

	"budgetcheck/budget/unit"
)

// event is what a firing is expected to add, in g or kWh.
type event struct {
	at    unit.Instant
	value float64
}

// estimate is what the runs left of one job are expected to add, in g or kWh,
// and why that is uncertain.
type estimate struct {
	job     Job
	past    []Run
	firings []firing
	runs    float64

	events   []event
	expected float64
	weather  share // one with that of other jobs in the zone
	noise    share // from run to run
	ratio    share // of the change
	count    share // of unscheduled runs
	miss     *float64

	told   bool // expected is known
	spread bool // so are the shares
	note   string
}

// estimate counts what is left, and tells whether past runs can stand for it.
func (j Job) estimate(p Period, now unit.Instant) *estimate {
	if j.Zone == "" && j.Series != nil {
		j.Zone = j.Series.Zone
	}
	e := &estimate{job: j, past: j.Past[max(len(j.Past)-lastRuns, 0):], firings: j.firings(p, now)}
	e.runs = runs(e.firings)
	e.told = e.runs == 0 || len(e.past) > 0
	e.spread = e.runs == 0 || len(e.past) > 1
	switch {
	case !e.told:
		e.note = fmt.Sprintf("%s has no past run to land its next ones by", j.Name)
	case !e.spread:
		e.note = fmt.Sprintf("%s has one past run only, which shows no spread", j.Name)
	}
	return e
}

// energy is the estimate in kWh.
func (j Job) energy(p Period, now unit.Instant) *estimate {
	e := j.estimate(p, now)
	if e.runs > 0 && e.told {
		each, noise := e.each(e.values(facility), 0)
		e.noise = noise
		e.price(func(firing) float64 { return each })
		e.ratio = share{e.runs * e.mean(facility) * j.RatioU, j.ratioDF()}
		e.counted(each)
	}
	return e
}

// facility and total are what a change of code changes, and what it leaves.
func facility(r Run) (changed, kept float64) { return float64(r.Facility), 0 }
func total(r Run) (changed, kept float64) {
	return float64(r.Total - r.Embodied), float64(r.Embodied)
}

// embodied is not changed by code, as long as the ratio of durations is not known.
func embodied(r Run) (changed, kept float64) { return float64(r.Embodied), 0 }

// values is one number for each past run, the changed part by the ratio.
func (e *estimate) values(of func(Run) (changed, kept float64)) []float64 {
	x := make([]float64, len(e.past))
	for n, r := range e.past {
		changed, kept := of(r)
		x[n] = changed*(1+e.job.Ratio) + kept
	}
	return x
}

// mean is that of the changed part as it was before the change.
func (e *estimate) mean(of func(Run) (changed, kept float64)) float64 {
	var sum unit.Sum[float64]
	for _, r := range e.past {
		changed, _ := of(r)
		sum.Add(changed)
	}
	return sum.Value() / float64(len(e.past))
}

// each is the mean of past runs and the uncertainty of the sum of the m runs
// left, s^2 (m + m^2/n), where n and m are the numbers of independent values at
// lag-1 autocorrelation r, and s^2 is freed of its bias by r.
func (e *estimate) each(x []float64, r float64) (mean float64, sum share) {
	mean, s := stat.MeanStdDev(x, nil)
	n, m := float64(len(x)), e.runs
	if n < 2 {
		return mean, share{}
	}
	independent := effective(n, r, 2)
	s2 := s * s * (n - 1) / max(n-n/independent, 0.5)
	return mean, share{math.Sqrt(s2 * (m*m/effective(m, r, 1) + m*m/independent)), independent - 1}
}

// price notes what each firing adds.
func (e *estimate) price(of func(firing) float64) {
	var sum unit.Sum[float64]
	e.events = make([]event, len(e.firings))
	for n, f := range e.firings {
		e.events[n] = event{f.at, f.weight * of(f)}
		sum.Add(e.events[n].value)
	}
	e.expected = sum.Value()
}

// counted adds the doubt about how many unscheduled runs there will be: N/D d is
// foretold with the variance N d/D (1 + d/D) of a Poisson count, known from N
// runs with 2 N degrees of freedom (JCGM 100:2008, G.4.2: 1/2 over the square
// of the relative uncertainty of u, which is 1/(2 sqrt N)).
func (e *estimate) counted(each float64) {
	if r := e.job.Rate; r != nil {
		ahead := e.runs / float64(r.Runs) // d/D
		e.count = share{each * math.Sqrt(e.runs*(1+ahead)), 2 * float64(r.Runs)}
	}
}

func (j Job) ratioDF() float64 {
	if j.RatioDF > 0 {
		return j.RatioDF
	}
	return math.Inf(1)
}
