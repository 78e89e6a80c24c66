// Package compare tells how the runs of a change differ from those of its base.
//
// A base and a head run differ in code and in weather. Held figures take the
// weather out: every run on both sides is restated with the base's mean
// intensity and mean PUE, so that duration, zone and hour of day do not matter.
package compare

import (
	"math"

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
