// Package footprint turns one record into energy and emissions.
//
// Weigh makes one pass over a record and gives a Part; Combine makes one Run of
// the parts of a run. Power is linear between two samples, intensity is a step
// function, and the integral of their product is exact: it is split at every
// sample and at every step.
//
//	measured    = sum over meters of integral P dt
//	machine     = measured / measured share   (or measured + unmetered power)
//	facility    = machine x PUE
//	operational = integral of facility power x intensity
//	embodied    = sum over parts TE x (time / lifetime) x (reserved / units)
//	total       = operational + embodied;   rate = total / work
//
// The last three are (O + M) per R of ISO/IEC 21031:2024.
package footprint

import (
	"budgetcheck/budget/finding"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// Site is what is known of the place where a part ran.
type Site struct {
	Name   string
	Zone   string
	PUE    float64         // power usage effectiveness (ISO/IEC 30134-2), at least 1
	Annual *unit.Intensity // average factor of the year; nil if not declared
	Market *unit.Intensity // market-based factor; nil if not declared
	Series *grid.Series    // of the zone; nil if there is none
	Broken *finding.Finding
}

// Machine is what is known of the machine on which a part ran.
type Machine struct {
	Name          string
	Units         float64        // above zero
	MeasuredShare unit.Share     // of its electricity that its meters see, above 0
	Unmetered     *unit.Power    // instead of MeasuredShare: what the meters do not see of the whole machine
	Meters        int            // how many meters a fully reserved machine has; 0 if not said
	Idle, Rated   *unit.Power    // plausible range; nil if not said
	Embodied      *unit.Mass     // TE, total embodied emissions; nil if not said
	Lifetime      *unit.Duration // EL, expected lifespan; there if Embodied is
}

// Facts is what Weigh needs to know about one part. Site and Machine are nil
// where the policy does not know them: the figures that need them stay absent.
type Facts struct {
	Site    *Site
	Machine *Machine
	Assumed []string // what was assumed in them, for the run's notes
}

// Method is how all parts of a judgement are weighed, so that they can be
// added and compared.
type Method struct {
	Factor      grid.Factor
	Boundary    grid.Boundary
	MaxGap      unit.Duration // samples further apart leave a gap
	MinCoverage unit.Share    // holes of a series up to 1 less this may be priced by the annual mean
	Uncertainty Declared
}

// pricer prices the part's hours. An annual mean is an average factor and
// never stands in for a marginal one.
func (f Facts) pricer(m Method) (p grid.Pricer) {
	if f.Site == nil {
		return p
	}
	p.Series = f.Site.Series
	if m.Factor == grid.Average {
		p.Annual = f.Site.Annual
	}
	return p
}

// reservation is the share of the machine that the part holds: RR / ToR. It
// is no more than all, so that a false claim proves no more than that.
func (f Facts) reservation(reserved float64) float64 {
	if f.Machine == nil || reserved == 0 {
		return 1
	}
	return min(reserved/f.Machine.Units, 1)
}

// Doubt is a reason why a run's evidence does not carry a ruling.
type Doubt struct {
	Reason   string  `json:"reason"`
	Observed float64 `json:"observed,omitempty"` // with Limit and Unit, where the doubt is about a number
	Limit    float64 `json:"limit,omitempty"`
	Unit     string  `json:"unit,omitempty"` // empty where it is not
	// Refutes: the measured energy itself is in question, so that it does not
	// prove a limit passed.
	Refutes bool `json:"refutes,omitempty"`
	// Price: only the intensity is in question; energy figures stand.
	Price bool `json:"price,omitempty"`
	// Missing: a record that is still to come would settle the doubt.
	Missing bool `json:"missing,omitempty"`
}
