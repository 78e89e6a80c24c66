package shift

import (
	"errors"
	"fmt"
	"math"
	"sort"

	"budgetcheck/budget/unit"
)

// Sample is the machine's power at one moment of the run's own time.
type Sample struct {
	At unit.Duration // from the run's start on
	W  unit.Power
}

// Step is machine energy that is used at constant power from one moment of the
// run's own time until the next step.
type Step struct {
	From   unit.Duration
	Energy unit.Energy
}

// Profile is a run's machine power over its own time. It is made by Linear or
// Constant, and is safe for concurrent use.
type Profile struct {
	duration unit.Duration
	pieces   []piece // from 0 to duration, without gap
}

// piece is a stretch of the profile with power that changes evenly.
type piece struct {
	from, to unit.Duration
	w, slope float64 // W, W per s
	before   float64 // kWh of the pieces before it
}

// Linear is a profile of power that is linear between samples, which are in
// order. Two at one moment are a jump. The edges hold the nearest sample.
func Linear(duration unit.Duration, samples []Sample) (Profile, error) {
	if len(samples) == 0 {
		return Profile{}, errors.New("a profile needs at least one sample of power")
	}
	for n, s := range samples {
		if n > 0 && s.At < samples[n-1].At || s.At < 0 || s.At > duration {
			return Profile{}, fmt.Errorf("sample %d at %s is out of order or outside the run of %s", n, s.At, duration)
		}
		if !sound(float64(s.W)) {
			return Profile{}, fmt.Errorf("sample %d: a power of %v W is not a finite number from 0 up", n, float64(s.W))
		}
	}
	b := builder{}
	first, last := samples[0], samples[len(samples)-1]
	b.add(0, first.At, first.W, first.W)
	for n, s := range samples[1:] {
		b.add(samples[n].At, s.At, samples[n].W, s.W)
	}
	b.add(last.At, duration, last.W, last.W)
	return b.profile(duration)
}

// Constant is a profile in steps, as the books keep it by hours: the first from
// the run's start on, each until the next, the last until the run's end.
func Constant(duration unit.Duration, steps []Step) (Profile, error) {
	b := builder{}
	for n, s := range steps {
		to := duration
		if n+1 < len(steps) {
			to = steps[n+1].From
		}
		if n == 0 && s.From != 0 || to <= s.From {
			return Profile{}, fmt.Errorf("step %d from %s to %s: steps start at 0 and follow each other within the run", n, s.From, to)
		}
		if !sound(float64(s.Energy)) {
			return Profile{}, fmt.Errorf("step %d: an energy of %v kWh is not a finite number from 0 up", n, float64(s.Energy))
		}
		w := unit.Power(float64(s.Energy) * unit.JoulesPerKWh / (to - s.From).Seconds())
		b.add(s.From, to, w, w)
	}
	return b.profile(duration)
}

func sound(v float64) bool { return v >= 0 && !math.IsInf(v, 1) }

// builder lines pieces up and adds their energy.
type builder struct {
	pieces []piece
	energy unit.Sum[unit.Energy]
}

func (b *builder) add(from, to unit.Duration, w, until unit.Power) {
	if to <= from {
		return
	}
	seconds := (to - from).Seconds()
	b.pieces = append(b.pieces, piece{from, to, float64(w), float64(until-w) / seconds, float64(b.energy.Value())})
	b.energy.Add(unit.Joules(float64(w+until) / 2 * seconds).Energy())
}

func (b *builder) profile(duration unit.Duration) (Profile, error) {
	if duration <= 0 || len(b.pieces) == 0 {
		return Profile{}, fmt.Errorf("a run of %s has no profile", duration)
	}
	return Profile{duration, b.pieces}, nil
}

// Duration is how long the run takes without a pause.
func (p Profile) Duration() unit.Duration { return p.duration }

// Energy is the machine energy of the whole run.
func (p Profile) Energy() unit.Energy { return unit.Energy(p.until(p.duration)) }

// until is the energy in kWh from the run's start to a moment of its own time.
func (p Profile) until(at unit.Duration) float64 {
	at = min(max(at, 0), p.duration)
	n := sort.Search(len(p.pieces)-1, func(n int) bool { return p.pieces[n].to >= at })
	return p.pieces[n].until(at)
}

func (c *piece) until(at unit.Duration) float64 {
	s := (at - c.from).Seconds()
	return c.before + (c.w+c.slope*s/2)*s/unit.JoulesPerKWh
}

// table holds until at offset, offset + 1 s, and so on, latest first, so that
// starts that grow by a second read it forwards.
func (p Profile) table(offset unit.Duration) []float64 {
	values := make([]float64, (p.duration-offset)/unit.Second+1)
	n := 0
	for k := range values {
		at := offset + unit.Duration(k)*unit.Second
		for p.pieces[n].to < at {
			n++
		}
		values[len(values)-1-k] = p.pieces[n].until(at)
	}
	return values
}
