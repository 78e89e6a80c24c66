package shift

import (
	"fmt"
	"math"

	"budgetcheck/budget/unit"
)

// board holds what it costs to do each slot of the work in each slot of the
// time allowed. All charges are of machine energy, without PUE.
type board struct {
	run    Run
	at     Place
	how    Pausing
	energy []float64                   // of each work slot, kWh
	rest   map[unit.Duration][]float64 // the energy of each work slot after a moment within it
	time   []timeSlot
	last   []timeSlot // as time, but only for as long as the last work slot
}

// timeSlot is the intensity in a slot: a first value and its changes.
type timeSlot struct {
	known bool // all of it
	first float64
	cuts  []cut
	mean  float64
}

type cut struct {
	rise float64
	rest []float64 // of the work slots, at the moment of the rise
}

// The largest table of work slots by pauses, in bytes: eight weeks of work in
// slots of five minutes with the duration doubled.
const mostCells = 1 << 28

func newBoard(r Run, at Place, how Pausing) (*board, error) {
	d := r.Profile.duration
	work := int((d + how.Slot - 1) / how.Slot)
	// The second factor: 1.1 x 10 slots are 11, not 10.999.
	allowed := math.Floor(how.Stretch * float64(d) / float64(how.Slot) * (1 + 1e-12))
	if max(allowed-float64(work), 0)+1 > mostCells/float64(work) {
		return nil, fmt.Errorf("%s in slots of %s, %v times as long, has too many ways to pause; choose longer slots", d, how.Slot, how.Stretch)
	}
	b := &board{run: r, at: at, how: how, rest: map[unit.Duration][]float64{}}
	for j := range work {
		b.energy = append(b.energy, b.after(j, 0))
	}
	for i := range max(work, int(allowed)) {
		b.time = append(b.time, b.slot(i, how.Slot))
		b.last = append(b.last, b.slot(i, b.length(work-1)))
	}
	return b, nil
}

// begin is the start of a time slot.
func (b *board) begin(i int) unit.Instant {
	return b.run.Start.Add(unit.Duration(i) * b.how.Slot)
}

// length is that of a work slot.
func (b *board) length(j int) unit.Duration {
	return min(b.how.Slot, b.run.Profile.duration-unit.Duration(j)*b.how.Slot)
}

// after is the energy of a work slot after a moment within it.
func (b *board) after(j int, moment unit.Duration) float64 {
	from := unit.Duration(j) * b.how.Slot
	return b.run.Profile.until(from+b.how.Slot) - b.run.Profile.until(from+moment)
}

// slot reads the series over a time slot.
func (b *board) slot(i int, length unit.Duration) (t timeSlot) {
	from := b.begin(i)
	end, reached := from.Add(length), from
	for _, in := range b.at.Series.Between(from, end) {
		if in.From > reached {
			return timeSlot{}
		}
		until := min(in.To, end)
		t.mean += float64(in.I) * float64(until-reached) / float64(length)
		if reached == from {
			t.first = float64(in.I)
		} else if rise := float64(in.I) - t.value(); rise != 0 {
			t.cuts = append(t.cuts, cut{rise, b.rests(reached.Sub(from))})
		}
		reached = until
	}
	t.known = reached == end
	return t
}

// value is the last intensity so far.
func (t *timeSlot) value() float64 {
	v := t.first
	for _, c := range t.cuts {
		v += c.rise
	}
	return v
}

// rests is the energy of every work slot after a moment within it.
func (b *board) rests(moment unit.Duration) []float64 {
	r, ok := b.rest[moment]
	if !ok {
		r = make([]float64, len(b.energy))
		for j := range r {
			r[j] = b.after(j, moment)
		}
		b.rest[moment] = r
	}
	return r
}

// plain is the intensity of a slot that has but one, else -1.
func (t *timeSlot) plain() float64 {
	if !t.known || len(t.cuts) > 0 {
		return -1
	}
	return t.first
}

// in is the time slot as the work slot sees it.
func (b *board) in(j, i int) *timeSlot {
	if j == len(b.energy)-1 {
		return &b.last[i]
	}
	return &b.time[i]
}

// cost is the charge of a work slot in a time slot, which must be known.
func (b *board) cost(j, i int) float64 {
	t := b.in(j, i)
	return b.energy[j]*t.first + t.extra(j)
}

// extra is what the changes of intensity within the slot add for a work slot.
func (t *timeSlot) extra(j int) (g float64) {
	for _, c := range t.cuts {
		g += c.rise * c.rest[j]
	}
	return g
}

// mean is the intensity that a resume at a slot is charged with.
func (b *board) mean(j, i int) unit.Intensity { return unit.Intensity(b.in(j, i).mean) }
