package footprint

import "budgetcheck/budget/unit"

// Slice is what of a part falls into a span of time.
type Slice struct {
	Facility    unit.Energy
	Operational unit.Mass
	Embodied    unit.Mass
	Known       bool // the part's total is known
}

// Within is what of the booked part falls between from and to, as it is
// charged: energy and emissions by the hours they were used in, embodied
// emissions by time. Within an hour energy is taken as spread evenly.
func (b *Booked) Within(from, to unit.Instant) Slice {
	s := Slice{Known: b.Total != nil}
	for n, h := range b.Hours {
		share := overlap(h.From, b.hourEnd(n), from, to)
		s.Facility += h.KWh * unit.Energy(share)
		if h.G != nil {
			s.Operational += *h.G * unit.Mass(share)
		}
	}
	if b.Embodied != nil {
		s.Embodied = *b.Embodied * unit.Mass(overlap(b.Start, b.End, from, to))
	}
	return s
}

// hourEnd is where the n-th booked hour ends.
func (b *Booked) hourEnd(n int) unit.Instant {
	end := min(nextHour(b.Hours[n].From), max(b.End, b.Hours[n].From+1))
	if n+1 < len(b.Hours) {
		end = min(end, b.Hours[n+1].From)
	}
	return end
}

// overlap is the share of a to b that lies between from and to.
func overlap(a, b, from, to unit.Instant) float64 {
	if b <= a {
		if from <= a && a < to {
			return 1
		}
		return 0
	}
	inside := min(b, to).Sub(max(a, from))
	if inside <= 0 {
		return 0
	}
	return inside.Seconds() / b.Sub(a).Seconds()
}
