package budget

import (
	"cmp"
	"fmt"
	"maps"
	"slices"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// use is a span in which a part holds a meter, or units, of a host.
type use struct {
	run      *footprint.Run
	part     *footprint.Part
	from, to unit.Instant
}

// countedTwice doubts runs that use one device at the same time, or together
// reserve more units of a host than it has. Parts without a host are passed
// over: their devices cannot be told apart.
func countedTwice(runs []*footprint.Run) {
	hosts := map[[2]string][]use{}
	for _, r := range runs {
		for _, part := range r.Pieces {
			if part.Open.Host != "" && part.End > part.Open.At {
				k := [2]string{part.Open.Site, part.Open.Host}
				hosts[k] = append(hosts[k], use{r, part, part.Open.At, part.End})
			}
		}
	}
	for _, k := range slices.SortedFunc(maps.Keys(hosts), func(a, b [2]string) int {
		return cmp.Or(cmp.Compare(a[0], b[0]), cmp.Compare(a[1], b[1]))
	}) {
		uses := hosts[k]
		slices.SortStableFunc(uses, func(a, b use) int { return cmp.Compare(a.from, b.from) })
		shareMeters(uses)
		shareUnits(k[1], uses)
	}
}

// shareMeters sweeps over time with the last use of each meter at hand. Totals
// are of no meter.
func shareMeters(uses []use) {
	last := map[string]use{}
	for _, u := range uses {
		if u.part.Averaged {
			continue
		}
		for _, m := range u.part.Meters {
			if before, ok := last[m.Name]; ok && u.from < before.to {
				doubtAll([]use{before, u}, fmt.Sprintf("counted twice: %s and %s both have meter %s of host %s from %s on",
					before.part.File, u.part.File, m.Name, u.part.Open.Host, u.from))
			}
			if u.to >= last[m.Name].to {
				last[m.Name] = u
			}
		}
	}
}

// shareUnits sweeps over time with the uses that are still going on.
func shareUnits(host string, uses []use) {
	var going []use
	for _, u := range uses {
		going = slices.DeleteFunc(going, func(g use) bool { return g.to <= u.from })
		going = append(going, u)
		m := u.part.Facts.Machine
		if m == nil || len(going) == 1 {
			continue
		}
		var units float64
		for _, g := range going {
			units += reservedUnits(g.part, m)
		}
		if units > m.Units*(1+1e-12) {
			doubtAll(going, fmt.Sprintf("counted twice: %v of the %v units of host %s are reserved at %s, by %s among others",
				units, m.Units, host, u.from, u.part.File))
		}
	}
}

func reservedUnits(part *footprint.Part, m *footprint.Machine) float64 {
	if part.Open.Reserved == 0 {
		return m.Units
	}
	return part.Open.Reserved
}

// doubtAll doubts each run of the uses once.
func doubtAll(uses []use, reason string) {
	var told []*footprint.Run
	for _, u := range uses {
		if !slices.Contains(told, u.run) {
			told = append(told, u.run)
			u.run.Doubt(footprint.Doubt{Reason: reason})
		}
	}
}
