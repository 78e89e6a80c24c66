package footprint_test

import (
	"math/big"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// This file is the footprint once more, slowly and without rounding: rational
// numbers, every rule written out, nothing shared with the code it checks.

func rat(v float64) *big.Rat { return new(big.Rat).SetFloat64(v) }

func plus(a, b *big.Rat) *big.Rat  { return new(big.Rat).Add(a, b) }
func minus(a, b *big.Rat) *big.Rat { return new(big.Rat).Sub(a, b) }
func times(a, b *big.Rat) *big.Rat { return new(big.Rat).Mul(a, b) }
func over(a, b *big.Rat) *big.Rat  { return new(big.Rat).Quo(a, b) }
func float(r *big.Rat) float64     { f, _ := r.Float64(); return f }
func span(from, to int64) *big.Rat { return big.NewRat(to-from, 1e9) } // s

// piece is a time with linear power, or a gap where p0 is nil.
type piece struct {
	from, to int64 // ns from open
	p0, p1   *big.Rat
}

// pieces cuts the time from open to close into what a meter covers and what it
// does not.
func (m meter) pieces(end int64, maxGap int64, rated *big.Rat) (all []piece) {
	if m.counter {
		return m.counted(end, maxGap, rated)
	}
	linear := func(from, to int64, p0, p1 float64) {
		p := piece{from, to, rat(p0), rat(p1)}
		if to-from > maxGap {
			p.p0 = nil
		}
		all = append(all, p)
	}
	first, last := m.samples[0], m.samples[len(m.samples)-1]
	linear(0, first.at, first.value, first.value)
	for n, s := range m.samples[1:] {
		linear(m.samples[n].at, s.at, m.samples[n].value, s.value)
	}
	linear(last.at, end, last.value, last.value)
	return all
}

// counted does so for a counter.
func (m meter) counted(end int64, maxGap int64, rated *big.Rat) (all []piece) {
	for n, s := range m.samples[1:] {
		before := m.samples[n]
		p := piece{from: before.at, to: s.at}
		grown, wrap := minus(rat(s.value), rat(before.value)), rat(m.wrap)
		fell := grown.Sign() < 0
		if fell {
			grown = plus(grown, wrap)
		}
		switch {
		case fell && m.wrap == 0: // reset
		case m.wrap > 0 && rated != nil && times(rated, span(p.from, p.to)).Cmp(wrap) >= 0: // more than one wrap possible
		case fell && rated == nil && p.to-p.from > maxGap: // the same, for all we know
		default:
			p.p0 = over(grown, span(p.from, p.to))
			p.p1 = p.p0
		}
		all = append(all, p)
	}
	first, last := piece{to: m.samples[0].at}, piece{from: m.samples[len(m.samples)-1].at, to: end}
	if n := len(all); n > 0 && first.to <= maxGap {
		first.p0, first.p1 = all[0].p0, all[0].p1
	}
	if n := len(all); n > 0 && end-last.from <= maxGap {
		last.p0, last.p1 = all[n-1].p0, all[n-1].p1
	}
	return append(append([]piece{first}, all...), last)
}

// energy is the integral of the piece's power between two moments, Ws.
func (p piece) energy(from, to int64) *big.Rat {
	from, to = max(from, p.from), min(to, p.to)
	if p.p0 == nil || from >= to {
		return new(big.Rat)
	}
	at := func(t int64) *big.Rat {
		return plus(p.p0, times(minus(p.p1, p.p0), big.NewRat(t-p.from, p.to-p.from)))
	}
	return times(times(plus(at(from), at(to)), big.NewRat(1, 2)), span(from, to))
}

// exact are the sums of a record over all its meters, Ws and g.
type exact struct {
	measured, filled *big.Rat
	energy, mass     [4]*big.Rat // facility, by grid.Source
	unpriced         [4]bool
	provenEnergy     *big.Rat // facility
	provenMass       *big.Rat
	byHour           map[unit.Instant]*big.Rat // facility, by UTC hour
}

// weighExactly is the footprint of a drawn record that opens at start.
func weighExactly(d drawn, f footprint.Facts, m footprint.Method, reserved float64) *exact {
	e := &exact{measured: new(big.Rat), filled: new(big.Rat), provenEnergy: new(big.Rat), provenMass: new(big.Rat), byHour: map[unit.Instant]*big.Rat{}}
	for n := range e.energy {
		e.energy[n], e.mass[n] = new(big.Rat), new(big.Rat)
	}
	share, unmetered := rat(float64(f.Machine.MeasuredShare)), new(big.Rat)
	part := big.NewRat(1, 1)
	if reserved > 0 {
		part = over(rat(reserved), rat(f.Machine.Units))
	}
	if u := f.Machine.Unmetered; u != nil {
		share, unmetered = big.NewRat(1, 1), times(rat(float64(*u)), part)
	}
	var rated *big.Rat
	if r := f.Machine.Rated; r != nil {
		rated = times(times(rat(float64(*r)), share), part)
	}
	cuts := cutsOf(f.Site.Series, d.end)
	for _, mt := range d.meters {
		e.meter(mt.pieces(d.end, int64(m.MaxGap), rated), cuts, share, f)
	}
	for n, from := range cuts[:len(cuts)-1] {
		e.add(from, times(unmetered, span(from, cuts[n+1])), false, f)
	}
	return e
}

// meter adds one meter: what it covers, and its gaps at its mean power.
func (e *exact) meter(pieces []piece, cuts []int64, share *big.Rat, f footprint.Facts) {
	total, covered := new(big.Rat), new(big.Rat)
	for _, p := range pieces {
		if total = plus(total, p.energy(p.from, p.to)); p.p0 != nil {
			covered = plus(covered, span(p.from, p.to))
		}
	}
	e.measured = plus(e.measured, total)
	for _, p := range pieces {
		fill := p.p0 == nil && covered.Sign() > 0
		if fill {
			p.p0 = over(total, covered)
			p.p1 = p.p0
			e.filled = plus(e.filled, p.energy(p.from, p.to))
		}
		for n, from := range cuts[:len(cuts)-1] {
			e.add(from, over(p.energy(from, cuts[n+1]), share), !fill, f)
		}
	}
}

// add prices machine energy of one span without a change of price.
func (e *exact) add(from int64, machine *big.Rat, measured bool, f footprint.Facts) {
	if machine.Sign() == 0 {
		return
	}
	facility := times(machine, rat(f.Site.PUE))
	at := start.Add(unit.Duration(from))
	hour := at - at%unit.Instant(unit.Hour)
	e.byHour[hour] = plus(facility, orZero(e.byHour[hour]))
	i, source := priceExactly(at, f.Site)
	e.energy[source] = plus(e.energy[source], facility)
	if measured {
		e.provenEnergy = plus(e.provenEnergy, facility)
	}
	if i == nil {
		e.unpriced[source] = true
		return
	}
	g := over(times(facility, i), rat(3.6e6))
	e.mass[source] = plus(e.mass[source], g)
	if measured && source != grid.FromHole {
		e.provenMass = plus(e.provenMass, g)
	}
}
