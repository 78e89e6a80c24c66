package footprint_test

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// declared are the uncertainties of the sample policy: relative, standard.
var declared = footprint.Declared{
	Meter: ptr(unit.Share(0.02)), Share: ptr(unit.Share(0.05)), PUE: ptr(unit.Share(0.03)),
	Intensity: ptr(unit.Share(0.08)), Embodied: ptr(unit.Share(0.30)),
}

// certain is the method of the tests with these uncertainties.
func certain(d footprint.Declared) footprint.Method {
	m := method
	m.Uncertainty = d
	return m
}

// u is a standard uncertainty that must be known.
func u(t *testing.T, terms footprint.Terms, d footprint.Declared) float64 {
	t.Helper()
	got, ok := terms.U(d)
	require.True(t, ok)
	return got
}

// TestOperationalUncertainty: 2, 5, 3 and 8 % in quadrature are 10.0995 %
// (JCGM 100:2008, 5.1.2). Thirty runs share every input, so that it is the
// same for their sum (5.2.2); as if independent it would be 1.84 %.
func TestOperationalUncertainty(t *testing.T) {
	want := math.Sqrt(2*2+5*5+3*3+8*8) / 100
	assert.InDelta(t, 0.100995, want, 5e-7)
	r := kilowatt(t, 2).run(plain(flat(400)), certain(declared))
	assert.InEpsilon(t, want*800, u(t, r.Terms.Mass, declared), 1e-12)
	assert.InEpsilon(t, 2*want*800, value(t, r.Expanded), 1e-12, "expanded with k = 2")

	var month footprint.Terms
	for range 30 {
		month = month.Plus(1, r.Terms.Mass)
	}
	assert.InEpsilon(t, want*800*30, u(t, month, declared), 1e-12)
}

// TestEnergyUncertainty: energy does not depend on the intensity.
func TestEnergyUncertainty(t *testing.T) {
	r := kilowatt(t, 2).run(plain(flat(400)), certain(declared))
	assert.InEpsilon(t, 2*math.Sqrt(2*2+5*5+3*3)/100, u(t, r.Terms.Energy, declared), 1e-12)
}

// TestRatioUncertainty: operational and embodied 8 and 2 kg against 9 and 2 kg
// at one site. Most of the inputs' error cancels in the ratio: u(ln) is
// 0.5755 %. As if independent it would be over 14 %.
func TestRatioUncertainty(t *testing.T) {
	weigh := func(operational float64) *footprint.Run {
		f := plain(flat(operational * 1000)) // of 1 kWh
		f.Machine.Embodied, f.Machine.Lifetime = ptr(unit.Mass(2000)), ptr(unit.Hour)
		return kilowatt(t, 1).run(f, certain(declared))
	}
	base, head := weigh(8), weigh(9)
	require.InEpsilon(t, 10000, value(t, base.Total), 1e-12)
	require.InEpsilon(t, 11000, value(t, head.Total), 1e-12)
	b, h := value(t, base.Total), value(t, head.Total)
	ratio := footprint.Terms{}.Plus(1/h, head.Terms.Mass).Plus(-1/b, base.Terms.Mass)
	assert.InDelta(t, 0.005755, u(t, ratio, declared), 5e-7)
	apart := math.Hypot(u(t, head.Terms.Mass, declared)/h, u(t, base.Terms.Mass, declared)/b)
	assert.Greater(t, apart, 0.14)
}

// TestInputsByName: one intensity per zone, one PUE per site, the others per
// machine. Two runs that differ in all share nothing and join in quadrature.
func TestInputsByName(t *testing.T) {
	f := plain(flat(400))
	f.Machine.Embodied, f.Machine.Lifetime = ptr(unit.Mass(1000e3)), ptr(4*unit.Year)
	g := f
	g.Site, g.Machine = ptr(*f.Site), ptr(*f.Machine)
	g.Site.Name, g.Site.Zone, g.Machine.Name = "quay-south", "SOUTH", "octo"
	one, two := kilowatt(t, 2).run(f, certain(declared)), kilowatt(t, 2).run(g, certain(declared))
	assert.InEpsilon(t, u(t, one.Terms.Mass, declared)*math.Sqrt2, u(t, one.Terms.Mass.Plus(1, two.Terms.Mass), declared), 1e-12)

	for name, change := range map[string]func(*footprint.Facts){
		"pue":       func(h *footprint.Facts) { h.Site.Name = "quay-south" },
		"intensity": func(h *footprint.Facts) { h.Site.Zone = "SOUTH" },
		"machine":   func(h *footprint.Facts) { h.Machine.Name = "octo" },
	} {
		h := f
		h.Site, h.Machine = ptr(*f.Site), ptr(*f.Machine)
		change(&h)
		other := kilowatt(t, 2).run(h, certain(declared))
		both := u(t, one.Terms.Mass.Plus(1, other.Terms.Mass), declared)
		assert.Less(t, both, 2*u(t, one.Terms.Mass, declared)*(1-1e-9), name)
		assert.Greater(t, both, math.Sqrt2*u(t, one.Terms.Mass, declared)*(1+1e-9), name)
	}
}

// TestNotDeclared: with nothing declared there is no uncertainty, also where
// gaps alone would give one.
func TestNotDeclared(t *testing.T) {
	s := open(t).powers(0, hour, 60, "m", 1000).power(hour+60, "m", 500).close(2 * hour)
	r := s.run(plain(flat(400)), method)
	assert.Nil(t, r.Expanded)
	_, ok := r.Terms.Mass.U(footprint.Declared{})
	assert.False(t, ok)

	one := footprint.Declared{Intensity: declared.Intensity}
	r = kilowatt(t, 1).run(plain(flat(400)), certain(one))
	assert.InEpsilon(t, 2*0.08*400, value(t, r.Expanded), 1e-12, "what is not declared adds nothing")
}

// TestUnmeteredUncertainty: the meters' share scales with the meters, the
// declared power with the share.
func TestUnmeteredUncertainty(t *testing.T) {
	f := plain(flat(400))
	f.Machine.MeasuredShare, f.Machine.Unmetered = 0, ptr(unit.Power(3000))
	r := kilowatt(t, 1).run(f, certain(declared))
	want := math.Sqrt(math.Pow(0.02*400, 2) + math.Pow(0.05*1200, 2) + math.Pow(0.03*1600, 2) + math.Pow(0.08*1600, 2))
	assert.InEpsilon(t, want, u(t, r.Terms.Mass, declared), 1e-12)
}

// gapTerm is the random part of a run's mass and energy.
func gapTerm(t *testing.T, s *sheet, f footprint.Facts) (mass, energy float64) {
	r := s.run(f, certain(declared))
	require.NotNil(t, r.Operational)
	return math.Sqrt(r.Terms.Mass.Random), math.Sqrt(r.Terms.Energy.Random)
}

// TestGapUncertainty: (max - min)/sqrt(12) of the meter's covered power over
// the gap (JCGM 100:2008, 4.3.7), linear within a meter, since all its gaps
// are filled with one mean, and in quadrature between meters.
func TestGapUncertainty(t *testing.T) {
	f := plain(series(hour, 100, 500))
	f.Site.PUE, f.Machine.MeasuredShare = 1.5, 0.75
	scale := 600 / math.Sqrt(12) * 1.5 / 0.75 / 3.6e6 // kWh for each second of a gap

	// 400 to 1000 W; gaps of 600 s in the first and of 1200 s in the second hour.
	gaps := func(s *sheet, meter string) *sheet {
		return s.powers(0, 600, 60, meter, 400).powers(1200, 4800, 60, meter, 1000).powers(6000, 7200, 60, meter, 400)
	}
	mass, energy := gapTerm(t, gaps(open(t), "a").close(7200), f)
	assert.InEpsilon(t, scale*1800, energy, 1e-12)
	assert.InEpsilon(t, scale*(600*100+1200*500), mass, 1e-12)

	mass, energy = gapTerm(t, gaps(gaps(open(t), "a"), "b").close(7200), f)
	assert.InEpsilon(t, math.Sqrt2*scale*1800, energy, 1e-12)
	assert.InEpsilon(t, math.Sqrt2*scale*(600*100+1200*500), mass, 1e-12)

	// 400 and 1000 W are met only for a moment, beside a gap.
	moments := open(t).power(0, "a", 700).power(60, "a", 400).power(660, "a", 1000).power(720, "a", 700).power(1320, "a", 700).close(1320)
	_, energy = gapTerm(t, moments, f)
	assert.InEpsilon(t, scale*1200, energy, 1e-12)

	mass, energy = gapTerm(t, open(t).powers(0, 3600, 60, "a", 400).powers(7000, 7200, 60, "a", 400).close(7200), f)
	assert.Zero(t, mass, "a steady meter leaves nothing open")
	assert.Zero(t, energy)
}

// TestExpectedUncertainty: an expected intensity is uncertain by the scatter
// of the days it comes from. 100 to 700 g/kWh: 1/sqrt(3) of their mean. Hours
// of one night share its weather and add, in one part as in several.
func TestExpectedUncertainty(t *testing.T) {
	var week []float64
	for d := range 7 {
		for range 24 {
			week = append(week, float64(100*(d+1)))
		}
	}
	f, end := plain(series(hour, week...)), 7*24*hour
	weigh := func(n string, of int, from, to float64) *footprint.Part {
		return open(t, part(n, of), opensAt(end+from)).powers(end+from, end+to, 60, "m", 1000).close(end+to).weigh(f, certain(declared))
	}
	whole := footprint.Combine([]*footprint.Part{weigh("a", 1, 0, 3*hour)}, certain(declared))
	assert.InEpsilon(t, 3*400/math.Sqrt(3), math.Sqrt(whole.Terms.Mass.Random), 1e-12)
	assert.Zero(t, whole.Terms.Energy.Random)
	split := footprint.Combine([]*footprint.Part{weigh("a", 2, 0, hour), weigh("b", 2, hour, 3*hour)}, certain(declared))
	assert.InEpsilon(t, whole.Terms.Mass.Random, split.Terms.Mass.Random, 1e-12)
}

// TestPlus: adding leaves the terms it adds alone.
func TestPlus(t *testing.T) {
	in := footprint.Input{Kind: footprint.InputMeter, Name: "quad"}
	a, b := footprint.Terms{By: map[footprint.Input]float64{in: 3}, Random: 2}, footprint.Terms{By: map[footprint.Input]float64{in: 5}, Random: 7}
	c := a.Plus(-2, b)
	assert.InDelta(t, 3-10, c.By[in], 0)
	assert.InDelta(t, 2+4*7, c.Random, 0)
	assert.InDelta(t, 3, a.By[in], 0)
	assert.InDelta(t, 5, b.By[in], 0)
	assert.InDelta(t, 0.02*7, u(t, footprint.Terms{By: c.By}, declared), 1e-15)
	_, ok := (footprint.Terms{}).U(declared)
	assert.True(t, ok, "nothing has no uncertainty, which is known")
}
