package budget

import (
	"fmt"
	"slices"
	"strings"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// Set parses text like "40 kg", "12 kWh" or "1.2 g per 1000 step".
func (l *Limit) Set(text string) error {
	if strings.Contains(text, " per ") {
		l.Rate = new(unit.Rate)
		return l.Rate.Set(text)
	}
	if e, err := unit.ParseEnergy(text); err == nil {
		l.Energy = &e
		return nil
	}
	m, err := unit.ParseMass(text)
	if err != nil {
		return fmt.Errorf("%w; a limit may also be an energy, like %q, or a rate, like %q", err, "12 kWh", "1.2 g per 1000 step")
	}
	l.Mass = &m
	return nil
}

func (l Limit) String() string {
	switch {
	case l.Mass != nil:
		return l.Mass.String()
	case l.Energy != nil:
		return l.Energy.String()
	}
	return l.Rate.String()
}

// base is the limit as it is judged: in g, in kWh, or in g for as many
// functional units as it names. Brought to one unit it would be rounded, and
// exactly at the limit is within.
func (l Limit) base() float64 {
	switch {
	case l.Mass != nil:
		return float64(*l.Mass)
	case l.Energy != nil:
		return float64(*l.Energy)
	}
	return float64(l.Rate.Mass)
}

// shown brings a judged value to unit: a rate to one functional unit.
func (l Limit) shown(v float64) float64 {
	if l.Rate != nil {
		return v / l.Rate.Per
	}
	return v
}

// unit names the unit of what is shown.
func (l Limit) unit() string {
	switch {
	case l.Mass != nil:
		return "g"
	case l.Energy != nil:
		return "kWh"
	}
	return "g/" + l.Rate.Unit
}

// unfit tells why the run cannot be held against the limit at all; "" if it can.
func (l Limit) unfit(r *footprint.Run) string {
	switch {
	case l.Rate == nil:
		return ""
	case r.Work == nil && len(r.Doubts) > 0: // parts that disagree about their work have no sum
		return r.Doubts[0].Reason
	case r.Work == nil:
		return fmt.Sprintf("run %s has no work lines; the limit is per %s", r.Run, l.Rate.Unit)
	case r.Work.Unit != l.Rate.Unit:
		return fmt.Sprintf("work of run %s is told in %s, the limit is per %s", r.Run, r.Work.Unit, l.Rate.Unit)
	case r.Work.Done == 0:
		return fmt.Sprintf("run %s has done no work", r.Run)
	}
	return ""
}

// of is the run's figure; known is false where it is absent.
func (l Limit) of(r *footprint.Run, d footprint.Declared) (a amount, known bool) {
	switch {
	case l.Energy != nil && r.Facility != nil:
		a.value = float64(*r.Facility)
		a.u, a.hasU = r.Terms.Energy.U(d)
	case l.Energy == nil && r.Total != nil:
		a.value = float64(*r.Total)
		a.u, a.hasU = r.Terms.Mass.U(d)
	default:
		return a, false
	}
	return l.perWork(a, r), true
}

// doubts are the doubts about the run that concern the limit: an energy does
// not depend on its price.
func (l Limit) doubts(r *footprint.Run) []footprint.Doubt {
	if l.Energy == nil {
		return r.Doubts
	}
	return slices.DeleteFunc(slices.Clone(r.Doubts), func(d footprint.Doubt) bool { return d.Price })
}

// provable tells whether what is proven to be spent is a lower bound of the
// figure. It is none of a rate while work is still to come.
func (l Limit) provable(r *footprint.Run) bool {
	unfinished := r.Pilot || slices.ContainsFunc(r.Doubts, func(d footprint.Doubt) bool { return d.Missing })
	return !r.Refuted() && !(l.Rate != nil && unfinished)
}

// proven is what the run's measured, priced part alone comes to. Its
// uncertainty is taken from the whole run, which has no less.
func (l Limit) proven(r *footprint.Run, d footprint.Declared) amount {
	a := amount{value: float64(r.Proven.Total)}
	terms, whole := r.Terms.Mass, r.Total != nil
	if l.Energy != nil {
		a.value, terms, whole = float64(r.Proven.Facility), r.Terms.Energy, r.Facility != nil
	}
	if whole {
		a.u, a.hasU = terms.U(d)
	}
	return l.perWork(a, r)
}

func (l Limit) perWork(a amount, r *footprint.Run) amount {
	if l.Rate != nil { // multiplied first: whole numbers stay exact
		a.value = a.value * l.Rate.Per / r.Work.Done
		a.u = a.u * l.Rate.Per / r.Work.Done
	}
	return a
}

// text prints a value in the limit's unit.
func (l Limit) text(v float64) string {
	switch {
	case l.Mass != nil:
		return unit.Mass(v).String()
	case l.Energy != nil:
		return unit.Energy(v).String()
	}
	return l.rate(v).String()
}

// interval prints a value with its expanded uncertainty.
func (l Limit) interval(v, expanded float64) string {
	switch {
	case l.Mass != nil:
		return unit.Mass(v).PlusMinus(unit.Mass(expanded))
	case l.Energy != nil:
		return unit.Energy(v).PlusMinus(unit.Energy(expanded))
	}
	r, u := l.rate(v), l.rate(expanded)
	return r.Worded(r.Mass.PlusMinus(u.Mass))
}

// rate tells a judged value in the way that the limit is written.
func (l Limit) rate(v float64) unit.Rate {
	return unit.Rate{Mass: unit.Mass(v), Per: l.Rate.Per, Unit: l.Rate.Unit}
}

// texts prints an observed value beside the limit, and their difference.
func (l Limit) texts(observed float64) (value, limit, excess string) {
	switch {
	case l.Mass != nil:
		value, limit = unit.Apart(unit.Mass(observed), *l.Mass)
	case l.Energy != nil:
		value, limit = unit.Apart(unit.Energy(observed), *l.Energy)
	default:
		value, limit = unit.Apart(l.rate(observed), *l.Rate)
	}
	return value, limit, l.text(observed - l.base())
}
