package shift

import (
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// Run is what could have run at another time or place.
type Run struct {
	Profile  Profile
	Start    unit.Instant
	Embodied unit.Mass // of each second that the machine is held; 0 if none is declared
}

// Place is where a run is priced.
type Place struct {
	Name   string
	Series *grid.Series // nil where the zone has none: then nothing has a price
	PUE    float64      // facility energy per machine energy, from 1 up
}

// Total is what the run emits at a place when it starts then: PUE times the
// integral of machine power times intensity, and embodied emissions. ok is
// false where the run meets a hole or an end of the series.
func Total(r Run, at Place, start unit.Instant) (total unit.Mass, ok bool) {
	g, ok := charge(r.Profile, at.Series, start, r.Profile.until)
	return r.total(at, g), ok
}

// total adds PUE and embodied emissions to the charge of the machine's energy.
func (r Run) total(at Place, g float64) unit.Mass {
	return unit.Mass(g*at.PUE) + r.embodied()
}

// embodied is the same whenever the run starts and however it pauses, for
// hardware that waits is released.
func (r Run) embodied() unit.Mass {
	return r.Embodied * unit.Mass(r.Profile.duration.Seconds())
}

// charge is the emissions in g of the profile's energy without PUE. until is the
// profile's running energy.
func charge(p Profile, s *grid.Series, start unit.Instant, until func(unit.Duration) float64) (g float64, ok bool) {
	var sum unit.Sum[unit.Mass]
	end, reached, before := start.Add(p.duration), start, 0.0
	for _, in := range s.Between(start, end) {
		if in.From > reached {
			return 0, false
		}
		reached = min(in.To, end)
		energy := until(reached.Sub(start))
		sum.Add(in.I.Of(unit.Energy(energy - before)))
		before = energy
	}
	return float64(sum.Value()), reached == end
}

// unbroken cuts a series at its holes.
func unbroken(steps []grid.Interval) (parts [][]grid.Interval) {
	first := 0
	for n := range steps {
		if n+1 == len(steps) || steps[n+1].From > steps[n].To {
			parts = append(parts, steps[first:n+1])
			first = n + 1
		}
	}
	return parts
}
