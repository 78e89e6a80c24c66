package compare

import "budgetcheck/budget/unit"

// Bridge is the change of emissions from base to head split by cause, g CO2e.
// What stands in it adds up to the change, to rounding, and swapping the sides
// flips every sign. Work and Efficiency stand for jobs whose work is known on
// both sides, Energy for the others; nil is a cause that does not apply.
type Bridge struct {
	Work       *unit.Mass `json:"work_g,omitempty"`       // more or less of it
	Efficiency *unit.Mass `json:"efficiency_g,omitempty"` // machine energy per work
	Energy     *unit.Mass `json:"energy_g,omitempty"`     // machine energy, in place of the two
	Site       *unit.Mass `json:"site_g,omitempty"`       // PUE
	Grid       *unit.Mass `json:"grid_g,omitempty"`       // carbon intensity
	Embodied   *unit.Mass `json:"embodied_g,omitempty"`

	// Parts splits Grid further; nil unless every job that is on both sides
	// has its days.
	Parts *BridgeGrid `json:"grid,omitempty"`
}

// BridgeGrid splits the change that the grid causes. It adds up to Bridge.Grid.
type BridgeGrid struct {
	Zone unit.Mass `json:"zone_g"` // another zone, or another season in it
	Day  unit.Mass `json:"day_g"`  // a cleaner or dirtier day than the zone's mean
	Hour unit.Mass `json:"hour_g"` // cleaner or dirtier hours than the day's mean
}

// BridgeSide is what a job takes on one side: means per run, finite and not
// negative. Facility is zero only where Machine is, and Operational is zero
// where Facility is.
type BridgeSide struct {
	Work        *unit.Work  // nil where none is told
	Machine     unit.Energy // of a pilot, projected, like all the others
	Facility    unit.Energy
	Operational unit.Mass
	Embodied    *unit.Mass  // nil where none is declared
	Days        *BridgeDays // nil where a day is not covered
}

// BridgeJob is a job on both sides; nil is a side that has no run of it.
type BridgeJob struct{ Base, Head *BridgeSide }

// NewBridge sums the bridges of the jobs, each an LMDI-I of its own. A job on
// one side only is all work and embodied emissions. Where operational is zero
// on one side only, the factor that is zero there explains all of it: the grid
// where there is energy. Without jobs everything is nil.
func NewBridge(jobs ...BridgeJob) Bridge {
	var sum bridgeSum
	for _, j := range jobs {
		sum.job(j)
	}
	return sum.bridge()
}

// Change is what the bridge adds up to: head less base.
func (b Bridge) Change() unit.Mass {
	var sum unit.Sum[unit.Mass]
	for _, cause := range []*unit.Mass{b.Work, b.Efficiency, b.Energy, b.Site, b.Grid, b.Embodied} {
		if cause != nil {
			sum.Add(*cause)
		}
	}
	return sum.Value()
}
