package footprint

import (
	"fmt"
	"math"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// open is the open line that the part had.
func (b *Booked) open() record.Open {
	part := b.Parts[0]
	return record.Open{Run: b.Run.Run, Attempt: b.Attempt, Part: part.Part, Parts: b.Of, Host: part.Host, Job: b.Job, Stage: b.Stage,
		At: b.Start, Site: part.Site, Machine: part.Machine, Reserved: part.Reserved,
		Commit: b.Commit, Branch: b.Branch, Pull: b.Pull, Labels: b.Labels}
}

// Restore makes the part again, restated with the facts in force: machine =
// measured/share, facility = machine x PUE, and emissions in proportion.
// Prices stay as they were booked. file is what messages call it.
func (b *Booked) Restore(file string, m Method, look func(*record.Open) Facts) *Part {
	p := &Part{File: file, Open: b.open(), End: b.End, Outcome: b.Outcome, Closed: b.Closed, Findings: new(finding.List),
		Notes: b.Notes, Doubts: append([]Doubt(nil), b.Reasons...), Digest: b.Digest}
	p.Facts = look(&p.Open)
	p.Averaged = b.Grade == Averaged || b.Grade == Estimated
	p.Estimated = b.Grade == Estimated
	if b.Work != nil {
		w := *b.Work
		w.OfPart = b.WorkOfPart
		p.Work = &w
	}
	p.Progress, p.Pilot = b.Progress, len(b.Progress) > 0
	b.restoreEnergy(p)
	b.restate(p, m)
	return p
}

// restoreEnergy takes what the meters measured.
func (b *Booked) restoreEnergy(p *Part) {
	for _, name := range b.Parts[0].Meters {
		p.Meters = append(p.Meters, Meter{Name: name})
	}
	if b.Measured == nil {
		return
	}
	p.metered = *b.Measured
	p.filled.Add(b.FilledKWh)
	measured := p.metered - b.FilledKWh
	if c := b.Coverage; c != nil { // a difference would lose the digits of what is small beside what is filled
		measured = p.metered * unit.Energy(*c)
	}
	p.measured.Add(measured)
}

// restate brings energy and emissions to the facts in force.
func (b *Booked) restate(p *Part, m Method) {
	var was unit.Sum[unit.Energy]
	for _, h := range b.Hours {
		was.Add(h.KWh)
	}
	c := p.chain()
	p.unmetered = unit.Power(p.unmeteredPower()).Over(p.span())
	p.machine = unit.Energy(float64(p.metered)/c.share) + p.unmetered
	p.facility = p.machine * unit.Energy(c.pue)
	factor := restating(float64(was.Value()), float64(p.facility))
	if factor == 1 {
		p.facility = was.Value()
	}
	b.scale(p, m, factor)
	p.settleFacts()
	b.comparable(p, m)
}

// restating is the factor from what was booked to what the facts in force
// make of it; exactly 1 where only rounding differs.
func restating(was, is float64) float64 {
	if was == 0 || math.Abs(is-was) <= rounding*was {
		return 1
	}
	return is / was
}

// scale multiplies what is in proportion to the facility's energy. Hours that
// had no price when they were booked are priced, if they can be by now.
func (b *Booked) scale(p *Part, m Method, factor float64) {
	pricer := p.Facts.pricer(m)
	var s sums
	late := false
	for n, h := range b.Hours {
		if h.G == nil {
			h, _ = b.priced(n, pricer)
			late = true
		}
		h.KWh *= unit.Energy(factor)
		if h.G != nil {
			h.G = known(*h.G * unit.Mass(factor))
		}
		p.hours = append(p.hours, h)
		s.note(h)
	}
	p.priced, _ = s.priced()
	p.proven = proven{b.ProvenKWh * unit.Energy(factor), b.ProvenG * unit.Mass(factor)}
	if late {
		p.proven.operational = b.provenG(p.hours, p.proven.facility)
	}
	p.expected = b.ExpectedUG * factor
	p.random = random{math.Pow(b.GapUKWh*factor, 2), math.Pow(b.GapUG*factor, 2)}
}

// note adds an hour that was booked.
func (s *sums) note(h Hour) {
	s.energy[h.By].Add(h.KWh)
	if h.G == nil {
		s.unknown[h.By] = true
		return
	}
	s.mass[h.By].Add(*h.G)
}

// comparable doubts what cannot be restated: another factor, another boundary,
// another zone than the one it was priced with.
func (b *Booked) comparable(p *Part, m Method) {
	name := fmt.Sprintf("run %s", b.Run.Run)
	switch {
	case len(b.Hours) == 0:
	case b.Factor != m.Factor:
		p.doubt(Doubt{Price: true, Reason: fmt.Sprintf("%s was priced with the %s factor, the policy asks for %s", name, b.Factor, m.Factor)})
	case b.Boundary != m.Boundary:
		p.doubt(Doubt{Price: true, Reason: fmt.Sprintf("%s was priced with the %s boundary, the policy asks for %s", name, b.Boundary, m.Boundary)})
	case b.Zone != "" && p.zone() != "" && b.Zone != p.zone():
		p.doubt(Doubt{Price: true, Reason: fmt.Sprintf("%s was priced with zone %s; site %s is in zone %s now", name, b.Zone, p.Open.Site, p.zone())})
	}
}
