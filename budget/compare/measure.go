package compare

import (
	"fmt"
	"math"

	"budgetcheck/budget/unit"
)

// Measure is what is compared.
type Measure string

// The measures, in the words of the policy.
const (
	Total      Measure = "total"  // emissions, g
	PerWork    Measure = "rate"   // emissions for one functional unit, g
	EnergyOnly Measure = "energy" // energy of the machines, kWh
)

// Grid tells with which intensity emissions enter. It is nothing to EnergyOnly.
type Grid string

// The grids, in the words of the policy.
const (
	HeldGrid   Grid = "hold"   // restated with the base's mean intensity and PUE
	ActualGrid Grid = "actual" // as charged
)

// side is the base or the head of a comparison.
type side struct {
	x        []float64 // ln of each run's figure, in order of start
	variance float64   // sum over the runs of what projecting pilots adds to the variance of x
}

// sides are the logarithms of both sides' figures. reason tells why there are
// none, and is empty where there are.
func (q Question) sides(base, head []Sample) (b, h side, reason string) {
	if reason = q.unworkable(base, head); reason != "" {
		return b, h, reason
	}
	i := baseIntensity(base)
	var known [2]bool
	b, known[0] = q.side(base, i)
	h, known[1] = q.side(head, i)
	for n, name := range []string{"base", "head"} {
		if !known[n] {
			return b, h, fmt.Sprintf("a %s run has no %s, of which no ratio can be told", name, q.Measure.noun())
		}
	}
	return b, h, ""
}

func (m Measure) noun() string {
	if m == EnergyOnly {
		return "energy"
	}
	return "energy or no emissions"
}

// side takes the logarithms. ok is false where a run has no figure above zero.
func (q Question) side(runs []Sample, i unit.Intensity) (s side, ok bool) {
	var variance unit.Sum[float64]
	for _, r := range runs {
		v, ofEnergy := q.figure(r, i)
		if !positive(float64(r.Machine)) || !positive(v) {
			return side{}, false
		}
		s.x = append(s.x, math.Log(v))
		share := ofEnergy / v // d ln v / d ln energy
		variance.Add(share * share * r.Variance)
	}
	s.variance = variance.Value()
	return s, true
}

// figure is what the run is compared by, and the part of it that scales with
// the run's energy.
func (q Question) figure(s Sample, i unit.Intensity) (v, ofEnergy float64) {
	operational := i.Of(s.Machine)
	switch {
	case q.Measure == EnergyOnly:
		return float64(s.Machine), float64(s.Machine)
	case q.Grid == ActualGrid:
		operational = s.Operational
	}
	per := 1.0
	if q.Measure == PerWork {
		per = s.Work.Amount
	}
	return float64(operational+s.Embodied) / per, float64(operational) / per
}

// unworkable tells why no rate can be told of the runs; empty where one can,
// or where none is asked for.
func (q Question) unworkable(base, head []Sample) string {
	if q.Measure != PerWork {
		return ""
	}
	word := ""
	for _, runs := range [][]Sample{base, head} {
		for _, s := range runs {
			switch {
			case !positive(s.Work.Amount):
				return "a run has no work done, of which no rate can be told"
			case word != "" && s.Work.Unit != word:
				return fmt.Sprintf("work is counted in %s and in %s, of which no common rate can be told", word, s.Work.Unit)
			}
			word = s.Work.Unit
		}
	}
	return ""
}
