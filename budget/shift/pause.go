package shift

import (
	"fmt"

	"budgetcheck/budget/unit"
)

// Pausing is how a run may be interrupted.
type Pausing struct {
	Slot     unit.Duration // pauses start and end at multiples of it from the run's own start
	MinSlice unit.Duration // least length of all slices but the last; rounded up to slots
	Stretch  float64       // total duration allowed, as a multiple of the run's own; from 1 up
	Resume   unit.Energy   // machine energy that each resume costs
}

// Span is a time in which the run works.
type Span struct {
	From unit.Instant `json:"from"`
	To   unit.Instant `json:"to"`
}

// Interrupted is the best interrupted run.
type Interrupted struct {
	Site       string      `json:"site"`
	Slots      []Span      `json:"slots"` // the slices
	Resumes    int         `json:"resumes"`
	Resume     unit.Energy `json:"resume_kwh"` // of the machine, for each resume
	Total      unit.Mass   `json:"total_g"`
	Saves      *unit.Mass  `json:"saves_g,omitempty"` // against the run as it was; nil where that has no price
	Stretch    float64     `json:"stretch"`
	*Threshold             // nil where too few slots have a price
}

// InterruptedRun is the way of pausing with the least total: the run's power in
// its own order, in slots from its own start on, within stretch times its
// duration rounded down to slots (but never fewer than it needs). A later first
// start is no resume. Of totals within 1e-9 it is the one that ends first. Slots
// that a hole of the series touches are not used; nil if the others do not suffice.
func InterruptedRun(r Run, at Place, how Pausing) (*Interrupted, error) {
	if how.Slot <= 0 || how.MinSlice < 0 || !(how.Stretch >= 1) || !sound(float64(how.Resume)) {
		return nil, fmt.Errorf("slot %s, min slice %s, stretch %v, resume %v kWh: a slot lasts, a stretch is 1 or more, and nothing is below zero",
			how.Slot, how.MinSlice, how.Stretch, float64(how.Resume))
	}
	b, err := newBoard(r, at, how)
	if err != nil {
		return nil, err
	}
	slots := b.plan()
	if slots == nil {
		return nil, nil
	}
	i := &Interrupted{Site: at.Name, Resume: how.Resume, Stretch: how.Stretch, Threshold: b.threshold()}
	i.Slots, i.Total = b.spans(slots), b.total(slots)
	i.Resumes = len(i.Slots) - 1
	i.Saves = saves(r, at, i.Total)
	return i, nil
}

// spans joins slots that follow each other. The last one may be short.
func (b *board) spans(slots []int) (spans []Span) {
	for j, i := range slots {
		span := Span{b.begin(i), b.begin(i).Add(b.length(j))}
		if n := len(spans); j > 0 && slots[j-1] == i-1 {
			spans[n-1].To = span.To
			continue
		}
		spans = append(spans, span)
	}
	return spans
}

// total prices the work slots at the given time slots, resumes included.
func (b *board) total(slots []int) unit.Mass {
	var sum unit.Sum[unit.Mass]
	for j, i := range slots {
		sum.Add(unit.Mass(b.cost(j, i)))
		if j > 0 && slots[j-1] != i-1 {
			sum.Add(b.mean(j, i).Of(b.how.Resume))
		}
	}
	return b.run.total(b.at, float64(sum.Value()))
}
