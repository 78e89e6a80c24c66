package budget

import (
	"fmt"
	"slices"
	"strings"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/unit"
)

// tally is a sum against a limit, and how far it can be trusted.
type tally struct {
	mass    unit.Sum[unit.Mass]
	energy  unit.Sum[unit.Energy]
	sure    amountSum // what is not in doubt, and what is proven of the rest
	terms   footprint.Figures
	doubted []string // runs
	reason  string   // of the first doubt that is not only a missing booking
	unread  string   // what of the books cannot be read
	runs    int
}

type amountSum struct {
	mass   unit.Sum[unit.Mass]
	energy unit.Sum[unit.Energy]
}

// booked adds what the books tell of an account. What was priced by another
// method than the policy's is no term of the sum, and leaves it in doubt.
func (t *tally) booked(b *Budget, s ledger.Spending, m footprint.Method) {
	for _, line := range s.Lines {
		if !b.covers(line.Job, line.Stage) {
			continue
		}
		if b.Limit.Energy == nil && (line.Factor != m.Factor || line.Boundary != m.Boundary) {
			t.doubted = append(t.doubted, line.Job)
			t.reason = fmt.Sprintf("runs of job %s were priced with the %s factor and the %s boundary, the policy asks for %s and %s",
				line.Job, line.Factor, line.Boundary, m.Factor, m.Boundary)
			continue
		}
		t.runs += line.Runs
		t.mass.Add(line.Total())
		t.energy.Add(line.Facility)
		t.sure.mass.Add(line.SureG + line.ProvenG)
		t.sure.energy.Add(line.SureKWh + line.ProvenKWh)
		if b.Limit.Energy != nil {
			t.doubted = append(t.doubted, line.InDoubtKWh...)
		} else {
			t.doubted = append(t.doubted, line.InDoubt...)
		}
		t.addTerms(line)
	}
}

// addTerms notes what the sums of a line scale with. Gaps are left out: over a
// period they are small beside what is shared.
func (t *tally) addTerms(line ledger.Spent) {
	operational, facility := float64(line.Operational), float64(line.Facility)
	add := func(terms *footprint.Terms, kind footprint.InputKind, name string, c float64) {
		*terms = terms.Plus(1, footprint.Terms{By: map[footprint.Input]float64{{Kind: kind, Name: name}: c}})
	}
	for terms, figure := range map[*footprint.Terms]float64{&t.terms.Mass: operational, &t.terms.Energy: facility} {
		add(terms, footprint.InputMeter, line.Machine, figure)
		add(terms, footprint.InputShare, line.Machine, figure)
		add(terms, footprint.InputPUE, line.Site, figure)
	}
	add(&t.terms.Mass, footprint.InputIntensity, line.Zone, operational)
	add(&t.terms.Mass, footprint.InputEmbodied, line.Machine, float64(line.Embodied))
}

// run adds those parts of a run that wanted names, as much of them as lies
// within the span.
func (t *tally) run(r *footprint.Run, policy *Policy, s span, wanted func(*footprint.Part) bool) {
	m := policy.Method()
	var inside unit.Sum[unit.Energy]
	touched := false
	for _, p := range r.Pieces {
		if !wanted(p) || !s.touches(p.Open.At, p.End) {
			continue
		}
		touched = true
		b := p.Book(m)
		in := b.Within(s.From, s.To)
		mass := in.Operational + in.Embodied
		t.mass.Add(mass)
		t.energy.Add(in.Facility)
		inside.Add(in.Facility)
		if !refutedBeside(r, p) {
			e := ledger.Entry{Thin: policy.thinPart(p), Booked: b}
			kwh, g := e.Certain(s.From, s.To)
			t.sure.energy.Add(kwh)
			t.sure.mass.Add(g)
		}
	}
	if !touched {
		return
	}
	t.runs++
	share := 1.0
	if r.Facility != nil && *r.Facility > 0 {
		share = float64(inside.Value()) / float64(*r.Facility)
	}
	t.terms.Mass = t.terms.Mass.Plus(share, r.Terms.Mass)
	t.terms.Energy = t.terms.Energy.Plus(share, r.Terms.Energy)
}

// refutedBeside tells whether the energy of the run is in question for a reason
// that is not about another part of it.
func refutedBeside(r *footprint.Run, p *footprint.Part) bool {
	return slices.ContainsFunc(r.Doubts, func(d footprint.Doubt) bool {
		return d.Refutes && !slices.ContainsFunc(r.Pieces, func(o *footprint.Part) bool { return o != p && slices.Contains(o.Doubts, d) })
	})
}

// settled drops the doubt that the books have of a run, for it is examined with
// all its parts, booked and given.
func (t *tally) settled(r *footprint.Run) {
	t.doubted = slices.DeleteFunc(t.doubted, func(name string) bool { return name == r.Run })
}

// examine notes what speaks against a run that lies within the span.
func (t *tally) examine(l Limit, r *footprint.Run, s span) {
	doubts := l.doubts(r)
	unknown := r.Total == nil
	if l.Energy != nil {
		unknown = r.Facility == nil
	}
	if !s.touches(r.Start, r.End) || len(doubts) == 0 && !unknown {
		return
	}
	t.doubted = append(t.doubted, r.Run)
	if t.reason == "" {
		t.reason = "what run " + r.Run + " took is not known"
		if len(doubts) > 0 {
			t.reason = doubts[0].Reason
		}
	}
}

// amount is the tally against a limit of mass or energy.
func (t *tally) amount(l Limit, d footprint.Declared) (a amount) {
	if l.Energy != nil {
		a.value = float64(t.energy.Value())
		a.u, a.hasU = t.terms.Energy.U(d)
		return a
	}
	a.value = float64(t.mass.Value())
	a.u, a.hasU = t.terms.Mass.U(d)
	return a
}

// proven is the tally of what is not in doubt. It has no more uncertainty than
// the whole.
func (t *tally) proven(l Limit, d footprint.Declared) amount {
	a := t.amount(l, d)
	a.value = float64(t.sure.mass.Value())
	if l.Energy != nil {
		a.value = float64(t.sure.energy.Value())
	}
	return a
}

// doubt says why the tally is not proven; "" if it is.
func (t *tally) doubt() string {
	names := slices.Clone(t.doubted)
	slices.Sort(names)
	names = slices.Compact(names)
	const most = 5
	switch n := len(names); {
	case t.unread != "":
		return t.unread
	case n == 0:
		return ""
	case t.reason != "" && n == 1:
		return t.reason
	case n > most:
		return fmt.Sprintf("the evidence of %d runs is in doubt, among them %s", n, names[0])
	}
	return fmt.Sprintf("the evidence of %s is in doubt", listed("run", names))
}

func listed(what string, names []string) string {
	if len(names) == 1 {
		return what + " " + names[0]
	}
	return what + "s " + strings.Join(names, ", ")
}
