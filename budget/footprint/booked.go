package footprint

import (
	"math"

	"budgetcheck/budget/unit"
)

// Booked is a part as the ledger keeps it: the run object of this part alone,
// and what else it takes to combine it with the run's other parts and to
// restate it with other facts. The energy lines themselves are not kept.
type Booked struct {
	Run
	Of         int    `json:"of_parts"` // how many parts the run has in all
	Closed     bool   `json:"closed"`
	Commit     string `json:"commit,omitempty"` // like Branch and Pull, a label of the record
	Branch     string `json:"branch,omitempty"`
	Pull       int    `json:"pull,omitempty"`
	WorkOfPart bool   `json:"work_of_part,omitempty"` // parts' work adds; else they tell one shared count
	Hours      []Hour `json:"hours"`                  // at the facility; where a fact is unknown, as if it were 1
	Digest     string `json:"digest,omitempty"`

	FilledKWh    unit.Energy `json:"filled_kwh,omitempty"`    // of measured_kwh, what fills gaps
	UnmeteredKWh unit.Energy `json:"unmetered_kwh,omitempty"` // of machine_kwh, what a declared unmetered power adds
	ProvenKWh    unit.Energy `json:"proven_kwh"`              // at the facility, measured alone
	ProvenG      unit.Mass   `json:"proven_g"`                // operational, measured and priced alone
	ExpectedUG   float64     `json:"expected_u_g,omitempty"`  // standard uncertainty of the expected hours
	GapUKWh      float64     `json:"gap_u_kwh,omitempty"`     // of the filled gaps
	GapUG        float64     `json:"gap_u_g,omitempty"`
	Reasons      []Doubt     `json:"doubts,omitempty"` // what speaks against the record itself
	// Progress of a run that planned more than it did: what the whole of it
	// would take is projected from it.
	Progress []Progress `json:"progress,omitempty"`
}

// keptProgress is how many steps of a pilot are booked: eight for each of the
// batches that it is cut into, and the ends.
const keptProgress = 66

// Book makes the ledger's form of a part.
func (p *Part) Book(m Method) Booked {
	run := Combine([]*Part{p}, m)
	run.Notes = p.Notes
	b := Booked{Run: *run, Of: max(p.Open.Parts, 1), Closed: p.Closed, Commit: p.Open.Commit, Branch: p.Open.Branch, Pull: p.Open.Pull,
		Hours: p.hours, Digest: p.Digest, FilledKWh: p.filled.Value(), UnmeteredKWh: p.unmetered,
		ProvenKWh: p.proven.facility, ProvenG: p.proven.operational, ExpectedUG: p.expected,
		GapUKWh: math.Sqrt(p.random.facility), GapUG: math.Sqrt(p.random.mass), Reasons: p.Doubts}
	if p.Work != nil {
		b.WorkOfPart = p.Work.OfPart
	}
	if p.Pilot {
		b.Progress = Thinned(p.Progress, keptProgress)
	}
	if n := p.Findings.Len(); n > 0 {
		b.Reasons = append(b.Reasons[:len(b.Reasons):len(b.Reasons)], p.unreadable())
	}
	return b
}
