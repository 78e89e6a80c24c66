package main

import (
	"bytes"
	"math"
	"strconv"
	"time"

	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// phase is a stretch of a run with one level of power.
type phase struct {
	until unit.Duration // its end, since the run's start
	watt  float64       // of one device
	tells bool          // whether a work line stands at its end
	done  float64       // with that much work
}

// phases lays out the run. All parts share it, for they work in step.
func (r *run) phases() []phase {
	const uneven = 0.012 // rounds differ by as much
	until := r.start
	all := []phase{{until: until, watt: r.startWatt, tells: true}}
	for n := range r.rounds {
		until += scaled(r.work, r.longer*r.about(uneven))
		done := r.planned * float64(n+1) / float64(r.rounds)
		all = append(all, phase{until, r.workWatt * r.stronger * r.about(uneven), true, done})
		until += scaled(r.check, r.longer)
		all = append(all, phase{until: until, watt: r.checkWatt * r.stronger})
	}
	return append(all, phase{until: until + r.end, watt: r.endWatt})
}

// about is a factor around 1.
func (r *run) about(spread float64) float64 { return 1 + spread*r.rng.NormFloat64() }

// scaled keeps to whole milliseconds, which records are written in.
func scaled(d unit.Duration, factor float64) unit.Duration {
	return unit.Duration(math.Round(d.Seconds()*factor*1e3)) * unit.Duration(time.Millisecond)
}

// records makes the record of each part.
func (r *run) records() ([]file, error) {
	phases := r.phases()
	var files []file
	for n, s := range r.seats {
		content, err := r.record(n, phases)
		if err != nil {
			return nil, err
		}
		files = append(files, file{s.file, content})
	}
	return files, nil
}

func (r *run) record(n int, phases []phase) ([]byte, error) {
	var content bytes.Buffer
	p := newPart(r, r.seats[n], record.NewWriter(&content))
	end := phases[len(phases)-1].until
	p.note(p.out.Open(r.opening(n)))
	for t := p.seat.late; t < end; t += period {
		at := t + p.jitter()
		for phases[0].until < at && len(phases) > 1 {
			p.tell(phases[0])
			phases = phases[1:]
		}
		p.sample(at, phases[0].watt)
	}
	p.note(p.out.Close(r.at.Add(end+period), record.OK))
	return content.Bytes(), p.err
}

// opening is the first line of part n.
func (r *run) opening(n int) record.Open {
	o, s := r.open, r.seats[n]
	o.At, o.Host, o.Reserved = r.at.Add(s.late), s.host, s.reserved
	if len(r.seats) > 1 {
		o.Part, o.Parts = strconv.Itoa(n), len(r.seats)
	}
	return o
}
