package budget

import (
	"fmt"
	"time"

	"budgetcheck/budget/unit"
)

// until is the end of the waiver's last day in the policy's time zone.
func (w *Waiver) until(in *time.Location) unit.Instant {
	d := w.Expires
	return unit.At(time.Date(d.Year, time.Month(d.Month), d.Day+1, 0, 0, 0, 0, in))
}

// waiver is the one in force for a rule and this change; nil if there is none.
// One that lifts the limit counts before one that excuses.
func (j *judgement) waiver(rule string, lifts bool) *Waiver {
	for _, w := range j.policy.Waivers {
		if w.Rule == rule && (w.Extra != nil) == lifts && (w.Pull == 0 || w.Pull == j.c.Pull) && j.c.Now < w.until(j.policy.location()) {
			return w
		}
	}
	return nil
}

// expired tells of waivers that are over, so that somebody deletes them.
func (j *judgement) expired() {
	for _, w := range j.policy.Waivers {
		if j.c.Now >= w.until(j.policy.location()) {
			j.s.note(fmt.Sprintf("the waiver of %q (%s:%d) expired at the end of %s; delete it", w.Rule, w.File, w.Line, w.Expires))
		}
	}
}

// waive lets a waiver stand in for over: the limit is lifted and the budget
// judged again. What is still over stays over.
func (j *judgement) waive(b *Budget, v verdictOn) verdictOn {
	if w := j.waiver(b.Name, true); w != nil && v.ruling.State == Over {
		lifted := *b
		lifted.Limit = b.Limit.plus(*w.Extra)
		again := j.judgeBudget(&lifted)
		if again.ruling.State == Within || again.ruling.State == Near {
			v.waived(w, fmt.Sprintf("limit lifted by %s to %s", w.Extra, lifted.Limit))
		}
	}
	if w := j.waiver(b.Name, false); w != nil && v.ruling.State == Unproven {
		v.waived(w, v.ruling.Reason)
	}
	return v
}

// waived marks ruling, account and landings.
func (v *verdictOn) waived(w *Waiver, what string) {
	v.ruling.excuse(w, what)
	if v.account != nil {
		v.account.State = Waived
	}
	for n := range v.landings {
		if s := v.landings[n].State; s == Over || s == Unproven {
			v.landings[n].State = Waived
		}
	}
}

func (r *Ruling) excuse(w *Waiver, what string) {
	r.State = Waived
	r.Reason = fmt.Sprintf("waived to the end of %s by %s (%s): %s", w.Expires, w.ApprovedBy, w.Reason, what)
}

// plus is the limit lifted by another of its kind; extra was checked.
func (l Limit) plus(extra Limit) Limit {
	switch {
	case l.Mass != nil:
		m := *l.Mass + *extra.Mass
		return Limit{Mass: &m}
	case l.Energy != nil:
		e := *l.Energy + *extra.Energy
		return Limit{Energy: &e}
	}
	r := *l.Rate
	r.Mass += extra.Rate.Mass * unit.Mass(r.Per/extra.Rate.Per)
	return Limit{Rate: &r}
}

// alike tells whether two limits can be added. One that could not be read is
// told elsewhere.
func (l Limit) alike(o Limit) bool {
	if !l.read() || !o.read() {
		return true
	}
	return (l.Mass != nil) == (o.Mass != nil) && (l.Energy != nil) == (o.Energy != nil) &&
		(l.Rate == nil || o.Rate != nil && l.Rate.Unit == o.Rate.Unit)
}

// read tells whether the limit could be read.
func (l Limit) read() bool {
	return l.Mass != nil || l.Energy != nil || l.Rate != nil && l.Rate.Per > 0
}
