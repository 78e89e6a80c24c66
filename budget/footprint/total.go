package footprint

import (
	"cmp"
	"fmt"
	"maps"
	"slices"
	"strings"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// energies sums measured, machine and facility energy over the parts.
func (r *Run) energies(m Method) {
	var metered, measured, filled, machine, facility unit.Sum[unit.Energy]
	machines, sites, grade := true, true, Measured
	for _, p := range r.Pieces {
		if len(p.Meters) == 0 {
			return // a doubt says so
		}
		metered.Add(p.metered)
		measured.Add(p.measured.Value())
		filled.Add(p.filled.Value())
		machine.Add(p.machine)
		facility.Add(p.facility)
		machines = machines && p.Facts.Machine != nil
		sites = sites && p.Facts.Site != nil
		if g := p.grade(); g.Worse(grade) {
			grade = g
		}
	}
	r.Grade = grade
	r.Measured = known(metered.Value())
	r.Coverage = coverage(measured.Value(), filled.Value())
	if machines {
		r.MachineKWh = known(machine.Value())
	}
	if machines && sites {
		r.Facility = known(facility.Value())
		r.hours()
		r.energyTerms()
		r.price(m)
	}
}

func (p *Part) grade() Grade {
	switch {
	case p.Estimated:
		return Estimated
	case p.Averaged:
		return Averaged
	case p.filled.Value() > 0:
		return Filled
	}
	return Measured
}

func known[T any](v T) *T { return &v }

// price sums operational emissions, where every hour that counts has a price.
func (r *Run) price(m Method) {
	var energy [4]unit.Sum[unit.Energy]
	var mass unit.Sum[unit.Mass]
	priced := [4]bool{true, true, true, true}
	for _, p := range r.Pieces {
		for n, s := range p.priced {
			energy[n].Add(s.energy)
			mass.Add(s.mass)
			priced[n] = priced[n] && s.known
		}
	}
	total := float64(*r.Facility)
	if total == 0 {
		return
	}
	share := func(s grid.Source) unit.Share { return unit.Share(float64(energy[s].Value()) / total) }
	r.Priced = &Priced{Series: share(grid.FromSeries), Expected: share(grid.FromExpected)}
	if priced[grid.FromAnnual] {
		r.Priced.Annual = share(grid.FromAnnual)
	}
	hole := share(grid.FromHole)
	if hole > 0 && priced[grid.FromHole] && hole <= holeLimit(m) {
		r.Priced.Annual += hole
	}
	if r.priceDoubts(m, share(grid.FromAnnual), hole, priced) {
		return
	}
	r.Operational = known(mass.Value())
	r.Intensity = known(unit.Intensity(float64(mass.Value()) / total))
	r.noteSources()
}

// rounding is how far, relatively, sums of floats may lie beside a limit that
// they are exactly at.
const rounding = 1e-12

// holeLimit is the share of a run's energy that an annual mean may price in
// holes of a series.
func holeLimit(m Method) unit.Share { return (1 - m.MinCoverage) * (1 + rounding) }

// priceDoubts tells whether some hour has no price that may be used.
func (r *Run) priceDoubts(m Method, annual, hole unit.Share, priced [4]bool) (doubted bool) {
	if annual > 0 && !priced[grid.FromAnnual] {
		r.Doubt(Doubt{Price: true, Reason: fmt.Sprintf("no intensity: there is no %s series for %s and no annual mean that may be used", m.Factor, r.zones())})
		doubted = true
	}
	if hole > 0 && (!priced[grid.FromHole] || hole > holeLimit(m)) {
		r.Doubt(Doubt{Price: true, Reason: fmt.Sprintf("no intensity: %s of the energy falls into holes of the series for %s", hole, r.zones()),
			Observed: float64(hole), Limit: float64(1 - m.MinCoverage), Unit: "share"})
		doubted = true
	}
	for _, p := range r.Pieces {
		if b := p.Facts.Site.Broken; b != nil {
			r.Doubt(Doubt{Price: true, Reason: fmt.Sprintf("the series for zone %s has rows that cannot be read, first %s", p.zone(), b)})
			return doubted
		}
	}
	return doubted
}

func (r *Run) zones() string {
	var zones []string
	for _, p := range r.Pieces {
		zones = append(zones, p.zone())
	}
	slices.Sort(zones)
	return "zone " + strings.Join(slices.Compact(zones), " and ")
}

// noteSources says what of the price is not measured.
func (r *Run) noteSources() {
	if s := r.Priced.Expected; s > 0 {
		r.note(fmt.Sprintf("provisional: %s of the energy lies after the series' end and has the expected intensity", s))
	}
	if s := r.Priced.Annual; s > 0 {
		r.note(fmt.Sprintf("%s of the energy is priced with the site's annual mean", s))
	}
}

// masses sums embodied emissions and totals.
func (r *Run) masses(m Method) {
	var embodied, market unit.Sum[unit.Mass]
	allEmbodied, allMarket := r.MachineKWh != nil, r.Facility != nil
	for _, p := range r.Pieces {
		embodied.Add(p.embodied)
		market.Add(p.market)
		allEmbodied = allEmbodied && p.Facts.Machine.Embodied != nil
		allMarket = allMarket && p.Facts.Site.Market != nil
	}
	if allEmbodied {
		r.Embodied = known(embodied.Value())
	}
	if allMarket {
		r.Market = known(market.Value())
	}
	r.prove(embodied.Value())
	if r.Operational != nil {
		r.total(m, embodied.Value())
	}
}

func (r *Run) total(m Method, embodied unit.Mass) {
	if r.Embodied == nil {
		r.note("no embodied emissions are declared for every machine: the total is smaller for it")
	}
	r.Total = known(*r.Operational + embodied)
	if w := r.Work; w != nil && w.Done > 0 {
		r.Rate = known(float64(*r.Total) / w.Done)
	}
	r.massTerms()
	if u, ok := r.Terms.Mass.U(m.Uncertainty); ok {
		r.Expanded = known(unit.Mass(2 * u))
	}
}

// prove sums what is measured and priced, and embodied emissions, which follow
// from the time alone.
func (r *Run) prove(embodied unit.Mass) {
	var total unit.Sum[unit.Mass]
	var facility unit.Sum[unit.Energy]
	for _, p := range r.Pieces {
		if p.Facts.Site == nil || p.Facts.Machine == nil {
			continue
		}
		facility.Add(p.proven.facility)
		if p.Facts.Site.Broken == nil {
			total.Add(p.proven.operational)
		}
	}
	total.Add(embodied)
	r.Proven = Proven{total.Value(), facility.Value()}
}

// hours lists the parts' hours. Those of two parts stay apart, for their zones
// may differ.
func (r *Run) hours() {
	for _, p := range r.Pieces {
		r.Hours = append(r.Hours, p.hours...)
	}
	slices.SortStableFunc(r.Hours, func(a, b Hour) int { return cmp.Compare(a.From, b.From) })
}

func (r *Run) energyTerms() {
	t := &r.Terms.Energy
	for _, p := range r.Pieces {
		p.terms(t, float64(p.facility))
		t.Random += p.random.facility
	}
}

// massTerms notes what each part's mass scales with. Its operational mass
// scales with everything in the chain.
func (r *Run) massTerms() {
	t := &r.Terms.Mass
	expected := map[string]float64{} // by zone, for parts share its weather too
	for _, p := range r.Pieces {
		var operational float64
		for _, s := range p.priced {
			operational += float64(s.mass)
		}
		p.terms(t, operational)
		t.add(InputIntensity, p.zone(), operational)
		t.add(InputEmbodied, p.Facts.Machine.Name, float64(p.embodied))
		t.Random += p.random.mass
		expected[p.zone()] += p.expected
	}
	for _, zone := range slices.Sorted(maps.Keys(expected)) {
		t.Random += expected[zone] * expected[zone]
	}
}

// terms adds the part's dependence on meter, share and PUE. What scales with
// the meters and what with a declared unmetered power are told apart.
func (p *Part) terms(t *Terms, figure float64) {
	machine := p.Facts.Machine
	byMeter, byShare := figure, figure
	if machine.Unmetered != nil && p.machine > 0 {
		byShare = figure * float64(p.unmetered) / float64(p.machine)
		byMeter = figure - byShare
	}
	t.add(InputMeter, machine.Name, byMeter)
	t.add(InputShare, machine.Name, byShare)
	t.add(InputPUE, p.Facts.Site.Name, figure)
}
