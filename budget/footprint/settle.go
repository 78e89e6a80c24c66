package footprint

import (
	"fmt"
	"math"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// span is the time from open to close.
func (p *Part) span() unit.Duration { return p.End.Sub(p.Open.At) }

// reservation is the share of the machine that the part holds.
func (p *Part) reservation() float64 { return p.Facts.reservation(p.Open.Reserved) }

// chain converts energy at the meters to the facility: x share^-1 x PUE. Where
// a link is unknown it counts 1, and the figure stays absent from the run.
type chain struct{ share, pue float64 }

func (p *Part) chain() chain {
	c := chain{1, 1}
	if m := p.Facts.Machine; m != nil && m.Unmetered == nil {
		c.share = float64(m.MeasuredShare)
	}
	if p.Facts.Site != nil {
		c.pue = p.Facts.Site.PUE
	}
	return c
}

// unmeteredPower is the constant power that the meters do not see, W.
func (p *Part) unmeteredPower() float64 {
	if m := p.Facts.Machine; m != nil && m.Unmetered != nil {
		return float64(*m.Unmetered) * p.reservation()
	}
	return 0
}

// settle sums the buckets into the part's figures.
func (w *weighing) settle() {
	p, c := w.part, w.part.chain()
	p.reachEnd(&w.line)
	var metered, unmetered, facility unit.Sum[unit.Energy]
	var s sums
	for n := range w.line.buckets {
		b := &w.line.buckets[n]
		measured, filled := b.measured.Value().Energy(), b.filled.Value().Energy()
		constant := unit.Joules(p.unmeteredPower() * b.overlap(p.Open.At, p.End).Seconds()).Energy()
		machine := unit.Energy(float64(measured+filled)/c.share) + constant
		fac := machine * unit.Energy(c.pue)
		metered.Add(measured + filled)
		unmetered.Add(constant)
		facility.Add(fac)
		s.add(b.price, fac, unit.Energy(float64(b.proven.Value().Energy())/c.share*c.pue))
		p.expected += float64(b.price.I.Of(fac)) * float64(b.price.U)
		p.hour(b.from, fac, b.price)
	}
	p.metered, p.unmetered, p.facility = metered.Value(), unmetered.Value(), facility.Value()
	p.machine = unit.Energy(float64(p.metered)/c.share) + p.unmetered
	p.priced, p.proven = s.priced()
	p.settleFacts()
}

// reachEnd makes the buckets up to the part's end, which a constant unmetered
// power needs even where no meter reaches.
func (p *Part) reachEnd(t *timeline) {
	for n := 0; ; n++ {
		if t.at(n).to >= p.End {
			return
		}
	}
}

// hour notes the energy of a bucket. Buckets without energy are left out.
func (p *Part) hour(from unit.Instant, e unit.Energy, price grid.Price) {
	if e <= 0 {
		return
	}
	h := Hour{From: from, KWh: e, By: price.Source}
	if price.Known {
		h.G = known(price.I.Of(e))
	}
	p.hours = append(p.hours, h)
}

// settleFacts adds what follows from the declared facts alone.
func (p *Part) settleFacts() {
	if s := p.Facts.Site; s != nil && s.Market != nil {
		p.market = s.Market.Of(p.facility)
	}
	p.embodied = p.EmbodiedOver(p.span())
}

// plausible checks that the machine's meters are there, and compares its mean
// power with its idle power.
func (w *weighing) plausible() {
	p := w.part
	m := p.Facts.Machine
	if m == nil {
		return
	}
	if p.Open.Reserved > m.Units {
		p.doubt(Doubt{Reason: fmt.Sprintf("%s reserves %v of the %v units of machine %s", p.File, p.Open.Reserved, m.Units, m.Name),
			Observed: p.Open.Reserved, Limit: m.Units, Unit: "units"})
	}
	if len(p.Meters) == 0 {
		return
	}
	have := len(p.Meters)
	if p.Averaged { // a total is of no meter
		have = 0
	}
	if want := p.metersWanted(); float64(have) < want {
		p.doubt(Doubt{Reason: fmt.Sprintf("meter missing: %s has %d of the %v meters of machine %s", p.File, have, want, m.Name),
			Observed: float64(have), Limit: want, Unit: "meters"})
	}
	if m.Idle == nil || p.span() == 0 {
		return
	}
	mean := unit.Power(float64(p.machine) * unit.JoulesPerKWh / p.span().Seconds() / p.reservation())
	if float64(mean) < float64(*m.Idle)*(1-rounding) {
		p.doubt(Doubt{Reason: fmt.Sprintf("%s: mean power of machine %s is %s, below its idle power of %s", p.File, m.Name, mean, *m.Idle),
			Observed: float64(mean), Limit: float64(*m.Idle), Unit: "W"})
	}
}

// metersWanted is how many meters the part must have. The product comes first:
// it is a whole number, so that the quotient is one where it ought to be.
func (p *Part) metersWanted() float64 {
	m := p.Facts.Machine
	all := float64(m.Meters)
	if p.Open.Reserved == 0 {
		return all
	}
	return min(all*p.Open.Reserved/m.Units, all)
}

// gapVariance adds the variance of a meter's gaps: each is uncertain by the
// spread of its covered power, (max - min)/sqrt(12), over its length (JCGM
// 100:2008, 4.3.7); linear within a meter, quadrature between.
func (w *weighing) gapVariance(m *meter) {
	c := w.part.chain()
	u := (m.high - m.low) / math.Sqrt(12) / c.share * c.pue
	var energy, mass float64
	m.missing(func(b *bucket, length unit.Duration) {
		e := unit.Joules(u * length.Seconds()).Energy()
		energy += float64(e)
		mass += float64(b.price.I.Of(e))
	})
	w.part.random.facility += energy * energy
	w.part.random.mass += mass * mass
}

// sums collects facility energy and mass by source of price.
type sums struct {
	energy            [4]unit.Sum[unit.Energy]
	mass              [4]unit.Sum[unit.Mass]
	unknown           [4]bool
	provenEnergy      unit.Sum[unit.Energy]
	provenOperational unit.Sum[unit.Mass]
}

// add takes one bucket: all its facility energy, and what of it is proven.
func (s *sums) add(price grid.Price, all, proven unit.Energy) {
	s.energy[price.Source].Add(all)
	s.provenEnergy.Add(proven)
	if !price.Known {
		s.unknown[price.Source] = s.unknown[price.Source] || all > 0
		return
	}
	s.mass[price.Source].Add(price.I.Of(all))
	if price.Source != grid.FromHole {
		s.provenOperational.Add(price.I.Of(proven))
	}
}

func (s *sums) priced() (p [4]priced, pr proven) {
	for n := range p {
		p[n] = priced{s.energy[n].Value(), !s.unknown[n], s.mass[n].Value()}
	}
	return p, proven{s.provenEnergy.Value(), s.provenOperational.Value()}
}
