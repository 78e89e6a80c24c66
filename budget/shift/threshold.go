package shift

import (
	"slices"

	"budgetcheck/budget/unit"
)

// Threshold is the run that works whenever the intensity is low enough. It keeps
// no least slice; its resumes are charged.
type Threshold struct {
	At    unit.Intensity `json:"threshold_g_per_kwh"` // the least such that the slots at or below it last the run
	Total unit.Mass      `json:"threshold_total_g"`
	Slots []Span         `json:"-"`
}

// threshold takes the slots at or below the threshold, earliest first. A slot
// that the series cuts has its mean over time.
func (b *board) threshold() *Threshold {
	var means []float64
	for _, t := range b.time {
		if t.known {
			means = append(means, t.mean)
		}
	}
	n := len(b.energy)
	if len(means) < n {
		return nil
	}
	slices.Sort(means)
	// Means that rounding tells apart are one.
	limit := means[n-1] * (1 + tie)
	var slots []int
	for i, t := range b.time {
		if t.known && t.mean <= limit && len(slots) < n {
			slots = append(slots, i)
		}
	}
	return &Threshold{unit.Intensity(means[n-1]), b.total(slots), b.spans(slots)}
}
