package footprint

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"math"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// priced is the n-th hour with the price of today, and whether it is another
// one. A series that is finer than the hour is averaged over it.
func (b *Booked) priced(n int, pricer grid.Pricer) (h Hour, changed bool) {
	h = b.Hours[n]
	end := b.hourEnd(n)
	var mass unit.Sum[unit.Mass]
	worst := grid.FromSeries
	for at := h.From; at < end; {
		price := pricer.At(at)
		if !price.Known {
			return h, false
		}
		until := min(price.Until, end)
		share := until.Sub(at).Seconds() / end.Sub(h.From).Seconds()
		mass.Add(price.I.Of(h.KWh * unit.Energy(share)))
		worst, at = max(worst, price.Source), until
	}
	g := mass.Value()
	changed = h.G == nil || *h.G != g || h.By != worst
	h.G, h.By = &g, worst
	return h, changed
}

// Settle prices again what was not priced by the series, with the series that
// have arrived since. The energies stay as they were booked, and so does what
// has its price from the series. settled tells whether anything changed.
func (b *Booked) Settle(file string, m Method, look func(*record.Open) Facts) (again Booked, settled bool) {
	was := *b
	open := b.open()
	pricer := look(&open).pricer(m)
	was.Hours = append([]Hour(nil), b.Hours...)
	for n, h := range b.Hours {
		if h.By == grid.FromSeries && h.G != nil {
			continue
		}
		if now, changed := b.priced(n, pricer); changed && now.By == grid.FromSeries {
			was.Hours[n], settled = now, true
		}
	}
	complete := b.Facility != nil
	if !settled && complete {
		return *b, false
	}
	again = was.rebook(file, m, look)
	return again, settled || again.Facility != nil
}

// rebook sums the hours up again. Where the facts were known when the part was
// booked, its energies and embodied emissions stay.
func (b *Booked) rebook(file string, m Method, look func(*record.Open) Facts) Booked {
	p := b.Restore(file, m, look)
	if b.Facility != nil {
		p.hours, p.machine, p.facility = b.Hours, *b.MachineKWh, *b.Facility
		p.unmetered = b.UnmeteredKWh
		var s sums
		for _, h := range p.hours {
			s.note(h)
		}
		p.priced, _ = s.priced()
		if b.Embodied != nil {
			p.embodied = *b.Embodied
		}
	}
	p.expected = 0
	for _, h := range p.hours {
		if h.By == grid.FromExpected && h.G != nil {
			p.expected = b.ExpectedUG
		}
	}
	p.proven.operational = b.provenG(p.hours, p.proven.facility)
	return p.Book(m)
}

// provenG is what the proven energy emits at least: all of the mass where
// nothing is filled, else its energy at the cleanest hour.
func (b *Booked) provenG(hours []Hour, proven unit.Energy) unit.Mass {
	var mass unit.Sum[unit.Mass]
	cleanest := math.Inf(1)
	for _, h := range hours {
		if h.G == nil || h.By == grid.FromHole {
			return 0
		}
		mass.Add(*h.G)
		cleanest = min(cleanest, float64(*h.G)/float64(h.KWh))
	}
	if b.FilledKWh == 0 || len(hours) == 0 {
		return mass.Value()
	}
	return unit.Mass(cleanest * float64(proven))
}

// FactsHash tells apart what a part was weighed with: method, facts, and the
// series over the time of the part.
func (p *Part) FactsHash(m Method) string {
	told := struct {
		Factor   grid.Factor
		Boundary grid.Boundary
		Site     *Site
		Machine  *Machine
		Steps    []grid.Interval
	}{Factor: m.Factor, Boundary: m.Boundary, Machine: p.Facts.Machine}
	if p.Facts.Site != nil {
		site := *p.Facts.Site
		told.Steps = site.Series.Between(p.Open.At, p.End)
		site.Series, site.Broken = nil, nil
		told.Site = &site
	}
	text, err := json.Marshal(told)
	if err != nil { // finite numbers and texts
		panic(err)
	}
	sum := sha256.Sum256(text)
	const enough = 8
	return hex.EncodeToString(sum[:enough])
}
