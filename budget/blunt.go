package budget

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/stat"

	"budgetcheck/budget/compare"
	"budgetcheck/budget/finding"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// Blunt warns of regressions whose max_rise is smaller than what the noise of
// the jobs lets them show: there a head run that takes just what the base takes
// is not proven to be within.
func (p *Policy) Blunt(runs []*footprint.Run) (warnings []finding.Finding) {
	for _, g := range p.Regressions {
		for _, group := range byJob(runs) {
			first := group[0]
			noise, n := scatter(group)
			if !g.covers(first.Job, first.Stage) || n < fewest {
				continue
			}
			rule := compare.Rule{MaxRise: g.MaxRise, Confidence: defaultConfidence, BaseRuns: min(n, g.BaseRuns)}
			if g.Confidence != nil {
				rule.Confidence = *g.Confidence
			}
			sure, _ := rule.Detectable(noise)
			if least, ok := rule.Resolution(noise); ok && float64(g.MaxRise) < least {
				warnings = append(warnings, finding.Finding{File: g.File, Line: g.Line,
					What: fmt.Sprintf("rule %q allows a rise of %s, and the energy of job %s scatters by %s from run to run: an unchanged run is within it for certain only from %s on, and a rise is found for certain from %s on",
						g.Name, g.MaxRise, first.Job, noise, unit.Share(least), unit.Share(sure)),
					Do: fmt.Sprintf("set max_rise to %s or more, raise base_runs above %d, or steady the job", unit.Share(least), rule.BaseRuns)})
			}
		}
	}
	return warnings
}

// fewest is how many runs show a scatter.
const fewest = 3

// scatter is the standard deviation of the logarithm of the runs' energy, and of
// how many runs.
func scatter(runs []*footprint.Run) (noise unit.Share, n int) {
	var x []float64
	for _, r := range runs {
		if w := r.Whole(); w != nil && r.Outcome.Evidence() && len(r.Doubts) == 0 && w.Machine > 0 {
			x = append(x, math.Log(float64(w.Machine)))
		}
	}
	if len(x) < fewest {
		return 0, len(x)
	}
	return unit.Share(stat.StdDev(x, nil)), len(x)
}
