package record

import (
	"fmt"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/unit"
)

// meters are interned: a line carries an index instead of a name.
type meters struct {
	names  []string
	byName map[string]int
	state  []meterState
	last   int
}

type meterState struct {
	kind  Kind
	at    unit.Instant
	value float64
	wrap  unit.Joules
}

// reading is the number on a power or energy line.
func (l *Line) reading() float64 {
	if l.Kind == KindPower {
		return float64(l.Power)
	}
	return float64(l.Joules)
}

func (l *Line) setReading(value, wrap float64) {
	if l.Kind == KindPower {
		l.Power = unit.Power(value)
		return
	}
	l.Joules, l.Wrap = unit.Joules(value), unit.Joules(wrap)
}

// sample checks a power or energy line. counts is false for a repeated one.
func (o *order) sample(l *Line, meter []byte) (wrong *finding.Finding, counts bool) {
	if wrong := o.place(l); wrong != nil {
		return wrong, false
	}
	i, known := o.meters.find(meter)
	if !known {
		return o.firstOf(l, string(meter))
	}
	m := &o.meters.state[i]
	value := l.reading()
	switch {
	case m.kind != l.Kind:
		return &finding.Finding{What: fmt.Sprintf("meter %s has %s lines and now a line of kind %s", quote(string(meter)), m.kind, l.Kind),
			Do: "write one kind of line for each meter"}, false
	case l.At < m.at:
		return &finding.Finding{What: fmt.Sprintf("meter %s goes back in time, from %s to %s", quote(string(meter)), m.at, l.At),
			Do: "write each meter's samples in time order"}, false
	case l.At == m.at && value == m.value:
		o.repeats++
		return nil, false
	case l.At == m.at:
		return &finding.Finding{What: fmt.Sprintf("meter %s has two readings at %s, %v and %v", quote(string(meter)), l.At, m.value, value),
			Do: "write one reading for each time"}, false
	case l.Wrap != 0 && l.Wrap != m.wrap:
		return &finding.Finding{What: fmt.Sprintf("meter %s changes its wrap_j from %v to %v", quote(string(meter)), float64(m.wrap), float64(l.Wrap)),
			Do: "write wrap_j on the meter's first line, once"}, false
	}
	l.Wrap = m.wrap
	if wrong := beyondWrap(l, string(meter)); wrong != nil {
		return wrong, false
	}
	m.at, m.value = l.At, value
	l.Meter = i
	o.seen(l.At, l.No)
	return nil, true
}

// firstOf takes a meter's first line.
func (o *order) firstOf(l *Line, meter string) (*finding.Finding, bool) {
	if len(meter) > MaxName {
		return &finding.Finding{What: fmt.Sprintf("the name of the meter is longer than %d bytes", MaxName), Do: "name meters by device"}, false
	}
	if len(o.meters.names) == MaxMeters {
		return &finding.Finding{What: fmt.Sprintf("meter %s is one more than %d meters", quote(meter), MaxMeters),
			Do: "name meters by device, not by sample, and write a part for each host"}, false
	}
	if wrong := beyondWrap(l, meter); wrong != nil {
		return wrong, false
	}
	l.Meter = o.meters.add(meter, meterState{l.Kind, l.At, l.reading(), l.Wrap})
	o.seen(l.At, l.No)
	return nil, true
}

func beyondWrap(l *Line, meter string) *finding.Finding {
	if l.Kind != KindEnergy || l.Wrap == 0 || l.Joules <= l.Wrap {
		return nil
	}
	return &finding.Finding{What: fmt.Sprintf("meter %s reads %v J, above its wrap_j of %v", quote(meter), float64(l.Joules), float64(l.Wrap)),
		Do: "write the counter's real range"}
}

// find looks a meter up; meters come in turns, so the next one is tried first.
func (m *meters) find(name []byte) (int, bool) {
	n := m.last + 1
	if n >= len(m.names) {
		n = 0
	}
	if n < len(m.names) && m.names[n] == string(name) {
		m.last = n
		return n, true
	}
	i, ok := m.byName[string(name)]
	if ok {
		m.last = i
	}
	return i, ok
}

func (m *meters) add(name string, s meterState) int {
	i := len(m.names)
	m.names = append(m.names, name)
	m.state = append(m.state, s)
	m.byName[name] = i
	return i
}
