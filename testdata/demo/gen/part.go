package main

import (
	"math"
	"math/rand/v2"
	"time"

	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// period is how often the meters are read.
const period = 10 * unit.Second

// part writes one record. After an error it goes on; only the first is kept.
type part struct {
	start  unit.Instant // of the run
	seat   seat
	rng    *rand.Rand
	meters []device
	job    job
	out    *record.Writer
	err    error
}

// device is a meter and what sets its readings apart from those of others.
type device struct {
	meter string
	bias  float64 // factor, the same in every run on this host
	noise *wander // W
}

func newPart(r *run, s seat, out *record.Writer) *part {
	const spread, remembers, watt = 0.02, 0.6, 7
	p := &part{start: r.at, seat: s, job: r.job, out: out, rng: stream(s.file)}
	for _, meter := range s.meters {
		bias := 1 + spread*stream(s.host+"/"+meter).NormFloat64()
		p.meters = append(p.meters, device{meter, bias, newWander(p.rng, remembers, watt)})
	}
	return p
}

func (p *part) note(err error) {
	if p.err == nil {
		p.err = err
	}
}

// jitter is how late the meters are read: never early, mostly a little.
func (p *part) jitter() unit.Duration {
	const usual, most = 120, 900 // ms
	late := math.Min(usual*math.Abs(p.rng.NormFloat64()), most)
	return unit.Duration(math.Round(late)) * unit.Duration(time.Millisecond)
}

// tell writes the progress at the end of a phase.
func (p *part) tell(ph phase) {
	if ph.tells {
		p.note(p.out.Work(p.start.Add(ph.until), record.Work{Unit: p.job.unit, Done: ph.done, Planned: p.job.planned}))
	}
}

// sample reads every meter that can be read.
func (p *part) sample(at unit.Duration, watt float64) {
	for _, d := range p.meters {
		reading := d.read(watt) // even if nobody notes it: the device goes on
		if !p.seat.outage.covers(d.meter, at) {
			p.note(p.out.Power(p.start.Add(at), d.meter, reading))
		}
	}
}

// read stays between what a device draws at rest and what it is capped at.
// Tenths of a watt also hide the last bits of a float, which differ between
// processors.
func (d device) read(watt float64) unit.Power {
	const rest, limit = 90, 420
	w := math.Min(math.Max(watt*d.bias+d.noise.next(), rest), limit)
	return unit.Power(math.Round(w*10) / 10)
}

func (o outage) covers(meter string, at unit.Duration) bool {
	return meter == o.meter && at >= o.from && at < o.to
}
