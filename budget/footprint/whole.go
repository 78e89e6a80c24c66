package footprint

import (
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// Whole is what all of a run's work takes: of a pilot as projected, of any
// other run as measured.
type Whole struct {
	Machine     unit.Energy
	Facility    unit.Energy
	Operational unit.Mass
	Embodied    unit.Mass // 0 where none is declared
	Duration    unit.Duration
	Work        float64     // functional units; 0 where none is told
	HalfWidth   unit.Energy // of Facility, 95 %; 0 unless projected
	Variance    float64     // relative, of Machine; 0 unless projected
}

// Total is operational and embodied emissions.
func (w *Whole) Total() unit.Mass { return w.Operational + w.Embodied }

// Total95 is half the width of the 95 % interval of a projected total.
func (w *Whole) Total95() unit.Mass {
	if w.Facility == 0 {
		return 0
	}
	return unit.Mass(float64(w.Operational) * float64(w.HalfWidth) / float64(w.Facility))
}

// Whole is what all of the run's work takes; nil where that is not known.
func (r *Run) Whole() *Whole {
	switch {
	case r.Pilot:
		return r.Projection
	case r.Total == nil:
		return nil
	}
	w := &Whole{Machine: *r.MachineKWh, Facility: *r.Facility, Operational: *r.Operational, Duration: r.End.Sub(r.Start)}
	if r.Embodied != nil {
		w.Embodied = *r.Embodied
	}
	if r.Work != nil {
		w.Work = r.Work.Done
	}
	return w
}

// Project notes what the pilot's whole run would take.
func (r *Run) Project(w *Whole) {
	r.Projection = w
	total, half := w.Total(), w.Total95()
	r.ProjectedKWh, r.ProjectedTotal = known(w.Facility), known(total)
	r.ProjectedLow, r.ProjectedHigh = known(max(total-half, 0)), known(total+half)
}

// MachineSteps is the progress with the energy of the machine, as the facts in
// force have it.
func (p *Part) MachineSteps() []Progress {
	c, unmetered := p.chain(), unit.Power(p.unmeteredPower())
	steps := make([]Progress, len(p.Progress))
	for n, s := range p.Progress {
		s.KWh = unit.Energy(float64(s.KWh)/c.share) + unmetered.Over(s.Elapsed)
		steps[n] = s
	}
	return steps
}

// MachineEnergy is the energy of the part's machine.
func (p *Part) MachineEnergy() unit.Energy { return p.machine }

// FacilityOf is what the facility takes for an energy of the machine.
func (p *Part) FacilityOf(machine unit.Energy) unit.Energy {
	return machine * unit.Energy(p.chain().pue)
}

// MeanPrice is the time mean of the intensity that the part's site has, or is
// expected to have, over a span; ok is false where a moment of it has none.
func (p *Part) MeanPrice(m Method, from unit.Instant, length unit.Duration) (mean unit.Intensity, ok bool) {
	pricer, to := p.Facts.pricer(m), from.Add(length)
	var sum unit.Sum[float64]
	for at := from; at < to; {
		price := pricer.At(at)
		if !price.Known {
			return 0, false
		}
		until := min(price.Until, to)
		sum.Add(float64(price.I) * until.Sub(at).Seconds())
		at = until
	}
	if length <= 0 {
		return 0, false
	}
	return unit.Intensity(sum.Value() / length.Seconds()), true
}

// EmbodiedOver is the embodied emissions of holding the part's machine for a
// while; 0 where none are declared.
func (p *Part) EmbodiedOver(length unit.Duration) unit.Mass {
	m := p.Facts.Machine
	if m == nil || m.Embodied == nil {
		return 0
	}
	return unit.Mass(float64(*m.Embodied) * length.Seconds() / m.Lifetime.Seconds() * p.reservation())
}

// Unfinished tells whether the part did less than it or a job plans.
func (p *Part) Unfinished(job float64) bool {
	w := p.Work
	return p.Outcome == record.Pilot || w != nil && p.Outcome == record.OK && max(w.Planned, job) > w.Done
}
