package forecast

import (
	"cmp"
	"slices"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// Quantity is what a budget limits: mass of CO2e in g, or facility energy in kWh.
type Quantity interface{ unit.Mass | unit.Energy }

// Budget is one period of one budget.
type Budget[Q Quantity] struct {
	Period Period
	Now    unit.Instant // nothing later is known
	Spent  Q            // in the period so far
	Limit  Q
	Jobs   []Job // all that are charged to it

	Known *Known // of the jobs' series; nil: they are read anew
}

// Landing is where the period of a budget will end if runs go on as scheduled.
type Landing[Q Quantity] struct {
	Period       Period
	Spent, Limit Q

	Expected  *Q            // at the end; nil where a job has runs left but no past one
	Low, High *Q            // 95 %, Low not below Spent; nil where a job has shown no spread
	U         Q             // standard uncertainty of Expected; 0 where Low is nil
	DF        float64       // its degrees of freedom; +Inf where U is known exactly, 0 where Low is nil
	RunsLeft  float64       // whole where all jobs have a schedule
	RunsOutOn *unit.Instant // the firing by which what is expected passes the limit, Now where it is passed; nil if it will not
	BurnRatio *float64      // share of the limit spent over share of the time gone; nil at the start, and without a limit
	Terms     []Term[Q]     // in the order of the jobs
	Notes     []string      // what makes the landing weak
}

// Term is what one job adds, with the standard uncertainties of Expected by cause.
type Term[Q Quantity] struct {
	Job      string
	RunsLeft float64
	Expected Q        // 0 where it is not known
	Weather  Q        // of the grid; from past totals it is of everything
	Noise    Q        // from run to run
	Ratio    Q        // of the change
	Count    Q        // of unscheduled runs
	Miss     *float64 // root mean square relative error of past predictions; nil where none could be made
}

// LandMass lands a budget in g CO2e.
func LandMass(b Budget[unit.Mass]) Landing[unit.Mass] {
	known := map[*grid.Series]*hourly{}
	return land(b, func(j Job) *estimate {
		if known[j.Series] == nil {
			known[j.Series] = b.Known.asOf(j.Series, b.Now)
		}
		return j.mass(b.Period, b.Now, known[j.Series])
	})
}

// LandEnergy lands a budget in kWh of facility energy, which knows no weather.
func LandEnergy(b Budget[unit.Energy]) Landing[unit.Energy] {
	return land(b, func(j Job) *estimate { return j.energy(b.Period, b.Now) })
}

func land[Q Quantity](b Budget[Q], of func(Job) *estimate) Landing[Q] {
	l := Landing[Q]{Period: b.Period, Spent: b.Spent, Limit: b.Limit, BurnRatio: burn(b)}
	estimates := make([]*estimate, len(b.Jobs))
	told, spread := true, true
	var expected, left unit.Sum[float64]
	expected.Add(float64(b.Spent))
	for n, j := range b.Jobs {
		e := of(j)
		estimates[n] = e
		expected.Add(e.expected)
		left.Add(e.runs)
		told, spread = told && e.told, spread && e.spread
		l.Terms = append(l.Terms, term[Q](e))
		if e.note != "" && !slices.Contains(l.Notes, e.note) {
			l.Notes = append(l.Notes, e.note)
		}
	}
	l.RunsLeft = left.Value()
	if total := Q(expected.Value()); told {
		l.Expected = &total
	}
	if told && spread {
		l.interval(combined(shares(estimates)))
	}
	l.RunsOutOn = runsOut(b, estimates)
	return l
}

// interval takes the quantile of Student's t on both sides. What is spent does
// not come back.
func (l *Landing[Q]) interval(s share) {
	l.U, l.DF = Q(s.u), s.df
	low, high := max(*l.Expected-Q(s.half()), l.Spent), *l.Expected+Q(s.half())
	l.Low, l.High = &low, &high
}

func term[Q Quantity](e *estimate) Term[Q] {
	return Term[Q]{e.job.Name, e.runs, Q(e.expected), Q(e.weather.u), Q(e.noise.u), Q(e.ratio.u), Q(e.count.u), e.miss}
}

// shares are the independent parts of the variance. Jobs in one zone have one
// weather: their shares of it add, with the least degrees of freedom among them.
// Everything else is each job's own.
func shares(estimates []*estimate) (all []share) {
	var zones []string
	var weather []share
	for _, e := range estimates {
		all = append(all, e.noise, e.ratio, e.count)
		if e.weather.u == 0 {
			continue
		}
		n := slices.Index(zones, e.job.Zone)
		if n < 0 {
			zones, weather = append(zones, e.job.Zone), append(weather, e.weather)
			continue
		}
		weather[n] = share{weather[n].u + e.weather.u, min(weather[n].df, e.weather.df)}
	}
	return append(all, weather...)
}

// runsOut is the firing at which the expected sum passes the limit. It goes by
// the jobs that are known; others can only bring it forward.
func runsOut[Q Quantity](b Budget[Q], estimates []*estimate) *unit.Instant {
	if b.Spent > b.Limit {
		return &b.Now
	}
	var events []event
	for _, e := range estimates {
		events = append(events, e.events...)
	}
	slices.SortStableFunc(events, func(a, b event) int { return cmp.Compare(a.at, b.at) })
	var sum unit.Sum[float64]
	sum.Add(float64(b.Spent))
	for _, e := range events {
		if sum.Add(e.value); sum.Value() > float64(b.Limit) {
			on := max(e.at, b.Now) // a run that is late comes now at the earliest
			return &on
		}
	}
	return nil
}

// burn tells how much faster than time the limit is spent.
func burn[Q Quantity](b Budget[Q]) *float64 {
	gone := min(b.Now, b.Period.To).Sub(b.Period.From).Seconds() / b.Period.To.Sub(b.Period.From).Seconds()
	if !(gone > 0) || b.Limit <= 0 {
		return nil
	}
	ratio := float64(b.Spent) / float64(b.Limit) / gone
	return &ratio
}
