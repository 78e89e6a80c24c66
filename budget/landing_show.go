package budget

import (
	"fmt"

	"budgetcheck/budget/forecast"
	"budgetcheck/budget/unit"
)

// show fills in the landing's figures, and the jobs for its page.
func (l *Landing) show(limit Limit, jobs []forecast.Job) {
	f := l.figure
	l.RunsLeft, l.RunsOutOn, l.BurnRatio = f.left, f.out, f.burn
	var without *float64
	if l.before != nil {
		without = l.before.expected
	}
	if limit.Energy != nil {
		l.SpentE, l.LimitE = as[unit.Energy](&f.spent), limit.Energy
		l.WithoutE, l.ExpectedE, l.LowE, l.HighE = as[unit.Energy](without), as[unit.Energy](f.expected), as[unit.Energy](f.low), as[unit.Energy](f.high)
	} else {
		l.Spent, l.Limit = as[unit.Mass](&f.spent), limit.Mass
		l.Without, l.Expected, l.Low, l.High = as[unit.Mass](without), as[unit.Mass](f.expected), as[unit.Mass](f.low), as[unit.Mass](f.high)
	}
	for n, t := range f.terms {
		job := landingJob{Job: jobs[n].Name, Left: t.runs}
		if t.runs > 0 {
			job.With = t.expected / t.runs
			if l.before != nil && l.before.terms[n].runs > 0 {
				job.Before = l.before.terms[n].expected / l.before.terms[n].runs
			}
		}
		l.jobs = append(l.jobs, job)
	}
}

func as[T ~float64](v *float64) *T {
	if v == nil {
		return nil
	}
	t := T(*v)
	return &t
}

// expected is where the period lands, for people.
func (l *Landing) expected() string { return l.Limits.text(*l.figure.expected) }

// interval is the same with its 95 % interval; "" where there is none.
func (l *Landing) interval() string {
	if l.figure.low == nil {
		return ""
	}
	return fmt.Sprintf("%s (%s to %s)", l.expected(), l.Limits.text(*l.figure.low), l.Limits.text(*l.figure.high))
}

// landingAccount shows where a mass budget's period stands and lands.
func (j *judgement) landingAccount(b *Budget, s span, r Ruling, l *Landing) *AccountLine {
	if b.Limit.Mass == nil {
		return nil
	}
	spent := j.booked(b, s).mass.Value()
	return &AccountLine{Name: b.Name, Per: b.Per, Period: s.Name, Brought: &spent, Limit: *b.Limit.Mass, State: r.State, Landing: l, Page: l.page()}
}

// page lists the runs that are left, as it stands and as it would stand.
func (l *Landing) page() (lines []PageLine) {
	if l.before != nil {
		lines = append(lines, l.side(l.before, false)...)
	}
	return append(lines, l.side(&l.figure, true)...)
}

func (l *Landing) side(f *landed, head bool) (lines []PageLine) {
	for _, job := range l.jobs {
		each := job.With
		if !head {
			each = job.Before
		}
		if job.Left > 0 && f.expected != nil {
			lines = append(lines, PageLine{Job: job.Job, Head: head, Left: job.Left, Each: unit.Mass(each)})
		}
	}
	if f.expected != nil {
		line := PageLine{Head: head, Lands: true, Each: unit.Mass(*f.expected)}
		line.Low, line.High = as[unit.Mass](f.low), as[unit.Mass](f.high)
		lines = append(lines, line)
	}
	return lines
}
