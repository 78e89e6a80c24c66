// Package compare tells how the runs of a change differ from those of its base.
//
// A base and a head run differ in code and in weather. Held figures take the
// weather out: every run on both sides is restated with the base's mean
// intensity and mean PUE, so that duration, zone and hour of day do not matter.
package compare

import (
	"math"

	"gonum.org/v1/gonum/stat"

	"budgetcheck/budget/unit"
)

// Sample is one run. Energies and Operational are above zero.
type Sample struct {
	Machine     unit.Energy
	Facility    unit.Energy
	Operational unit.Mass
	Embodied    unit.Mass // zero where none is declared
	Work        unit.Work // needed for a rate only
	Variance    float64   // relative variance of a projected pilot's energy; zero for a whole run
}

// Held are the figures of two sides with the grid held: geometric means.
type Held struct {
	Base, Head unit.Mass
	Ratio      float64 // Head/Base - 1
}

// Hold restates the runs of both sides as machine energy times the base's mean
// PUE and intensity, plus embodied emissions. ok is false where a side has no
// run, or one without energy or emissions, of which no ratio can be told.
func Hold(base, head []Sample) (h Held, ok bool) {
	i := baseIntensity(base)
	h.Base, h.Head = heldMean(base, i), heldMean(head, i)
	h.Ratio = float64(h.Head)/float64(h.Base) - 1
	return h, h.Base > 0 && h.Head > 0 && !math.IsInf(h.Ratio, 0)
}

// baseIntensity is what machine energy is restated with: the runs' mean
// intensity times their mean PUE. NaN where they have no energy.
func baseIntensity(base []Sample) unit.Intensity {
	var machine unit.Sum[unit.Energy]
	var operational unit.Sum[unit.Mass]
	for _, s := range base {
		machine.Add(s.Machine)
		operational.Add(s.Operational)
	}
	return unit.Intensity(float64(operational.Value()) / float64(machine.Value()))
}

// positive tells whether v is above zero and finite.
func positive(v float64) bool { return v > 0 && v <= math.MaxFloat64 }

// heldMean is the geometric mean of the runs' held totals; 0 where one has none.
func heldMean(runs []Sample, i unit.Intensity) unit.Mass {
	held := make([]float64, len(runs))
	for n, s := range runs {
		held[n] = float64(i.Of(s.Machine) + s.Embodied)
		if !positive(float64(s.Machine)) || !positive(held[n]) {
			return 0
		}
	}
	if len(held) == 0 {
		return 0
	}
	return unit.Mass(stat.GeometricMean(held, nil))
}
