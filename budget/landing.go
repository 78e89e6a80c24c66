package budget

import (
	"slices"

	"budgetcheck/budget/forecast"
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
		with = j.merged(b, jobs)
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
