package budget

import (
	"fmt"
	"math"

	"budgetcheck/budget/footprint"
)

// plausible bounds what is believed of a run, in any unit: nothing on Earth
// comes near. Below it sums stay finite, which JSON needs.
const plausible = 1e60

func believable[T ~float64](v *T) bool { return v == nil || math.Abs(float64(*v)) <= plausible }

// dropAbsurd takes the figures from a run whose record makes them absurd, and
// refutes it. Records come from the code under review: none may keep the
// statement from being written.
func dropAbsurd(r *footprint.Run) {
	fine := believable(r.Measured) && believable(r.MachineKWh) && believable(r.Facility) && believable(r.Operational) &&
		believable(r.Embodied) && believable(r.Total) && believable(r.Expanded) && believable(r.Market) && believable(r.Rate) && believable(r.Coverage)
	for _, part := range r.Parts {
		fine = fine && believable(part.Measured) && believable(part.Coverage)
	}
	if w := r.Work; w != nil {
		fine = fine && believable(&w.Done) && believable(&w.Planned)
	}
	if fine {
		return
	}
	r.Coverage, r.Priced, r.Measured, r.MachineKWh, r.Facility, r.Operational = nil, nil, nil, nil, nil, nil
	r.Embodied, r.Total, r.Expanded, r.Market, r.Intensity, r.Work, r.Rate = nil, nil, nil, nil, nil, nil, nil
	r.Proven = footprint.Proven{}
	for n := range r.Parts {
		r.Parts[n].Measured, r.Parts[n].Coverage = nil, nil
	}
	r.Doubt(footprint.Doubt{Refutes: true, Reason: fmt.Sprintf("the readings or the work of run %s come to figures that cannot be; mend %s", r.Run, r.Pieces[0].File)})
}
