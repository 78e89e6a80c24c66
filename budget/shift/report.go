package shift

import (
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// Report is all that is said of one run. A part that does not apply is nil.
type Report struct {
	Format   int          `json:"format"` // 1
	Job      string       `json:"job"`
	Run      string       `json:"run"`
	Energy   unit.Energy  `json:"energy_kwh"` // of the facility, as it ran
	Duration float64      `json:"duration_s"`
	Factor   grid.Factor  `json:"factor"`
	AsRun    *AsRun       `json:"as_run,omitempty"`
	Start    *Deferred    `json:"start,omitempty"`
	Pause    *Interrupted `json:"pause,omitempty"`
	Sites    []Row        `json:"sites,omitempty"`
	Spread   []Spread     `json:"spread,omitempty"`
}

// AsRun is the run as it was.
type AsRun struct {
	Site  string       `json:"site"`
	Start unit.Instant `json:"start"`
	Total unit.Mass    `json:"total_g"` // operational and embodied
}

// Was prices the run as it was; nil where the series does not know all of it.
func Was(r Run, at Place) *AsRun {
	total, ok := Total(r, at, r.Start)
	if !ok {
		return nil
	}
	return &AsRun{at.Name, r.Start, total}
}
