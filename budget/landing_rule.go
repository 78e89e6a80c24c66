package budget

import (
	"fmt"
	"slices"
)

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
