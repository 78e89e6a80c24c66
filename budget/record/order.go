package record

import (
	"fmt"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/unit"
)

// order holds what the lines of one record must agree on with one another.
type order struct {
	open     *Open
	refused  bool // the first line was no open line; said once
	closed   bool
	latest   unit.Instant // the latest time on any line
	latestNo int
	usedEnd  unit.Instant
	usedNo   int
	work     *Work
	repeats  int
	meters   meters
}

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
		return &finding.Finding{What: fmt.Sprintf("meter %s changes its wrap_j from %v to %v", quote(string(meter)), m.wrap, l.Wrap),
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
	if len(o.meters.names) == MaxMeters {
		return &finding.Finding{What: fmt.Sprintf("meter %s is one more than %d meters", quote(meter), MaxMeters),
			Do: "name meters by device, not by sample; write a part for each host"}, false
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

// place checks that a line stands between open and close and not before the
// open line's time.
func (o *order) place(l *Line) *finding.Finding {
	switch {
	case o.open == nil && o.refused:
		return &finding.Finding{What: "no open line stands before this line", Do: "mend the open line"}
	case o.open == nil:
		o.refused = true
		return &finding.Finding{What: fmt.Sprintf("the first line is of kind %s", l.Kind), Do: "write an open line first"}
	case o.closed:
		return &finding.Finding{What: "a line after the close line", Do: "write close last, and one record a file"}
	case l.Kind != KindUsed && l.At < o.open.At:
		return &finding.Finding{What: fmt.Sprintf("%s is before the record opens at %s", l.At, o.open.At), Do: "open the record before its first line"}
	}
	return nil
}

// rare checks the lines that are few.
func (o *order) rare(l *Line) (wrong *finding.Finding, counts bool) {
	if l.Kind == KindOpen {
		return o.opens(l)
	}
	if wrong := o.place(l); wrong != nil {
		return wrong, false
	}
	switch l.Kind {
	case KindUsed:
		wrong = o.used(l)
	case KindWork:
		wrong = o.progress(l.Work)
	case KindClose:
		wrong = o.closes(l)
	}
	if wrong == nil && l.Kind != KindUsed {
		o.seen(l.At, l.No)
	}
	return wrong, wrong == nil
}

func (o *order) opens(l *Line) (*finding.Finding, bool) {
	if o.open != nil {
		return &finding.Finding{What: "a second open line", Do: "write each part of each run to a file of its own"}, false
	}
	if o.refused {
		return &finding.Finding{What: "the open line is not the first line", Do: "write it first"}, false
	}
	o.open = l.Open
	o.seen(l.At, l.No)
	return nil, true
}

func (o *order) used(l *Line) *finding.Finding {
	u := l.Used
	switch {
	case u.From < o.open.At:
		return &finding.Finding{What: fmt.Sprintf("the total starts at %s, before the record opens at %s", u.From, o.open.At), Do: "open the record before it"}
	case u.From < o.usedEnd:
		return &finding.Finding{What: fmt.Sprintf("the total from %s overlaps or precedes that of line %d, which ends at %s", u.From, o.usedNo, o.usedEnd),
			Do: "write totals in time order, each span once"}
	}
	o.usedEnd, o.usedNo = u.To, l.No
	l.At = u.To
	o.seen(u.To, l.No)
	return nil
}

func (o *order) progress(w *Work) *finding.Finding {
	if last := o.work; last != nil {
		switch {
		case w.Unit != last.Unit:
			return &finding.Finding{What: fmt.Sprintf("work is told in %s and in %s", quote(last.Unit), quote(w.Unit)), Do: "use one unit in a record"}
		case w.Done < last.Done:
			return &finding.Finding{What: fmt.Sprintf("work done falls from %v to %v", last.Done, w.Done), Do: "write the work done since the start of the run"}
		case w.OfPart != last.OfPart:
			return &finding.Finding{What: `"of" changes within the record`, Do: "write run or part on every work line"}
		}
	}
	o.work = w
	return nil
}

// closes refuses a close before the latest line: such stop stamps are often
// copies of the start, and the run's end would be a guess.
func (o *order) closes(l *Line) *finding.Finding {
	if l.At < o.latest {
		return &finding.Finding{What: fmt.Sprintf("the record closes at %s, before line %d at %s", l.At, o.latestNo, o.latest),
			Do: "write the time at which the job ended"}
	}
	o.closed = true
	return nil
}

func (o *order) seen(at unit.Instant, no int) {
	if at > o.latest || o.latestNo == 0 {
		o.latest, o.latestNo = at, no
	}
}

// find looks a meter up; meters come in turns, so the next one is tried first.
func (m *meters) find(name []byte) (int, bool) {
	if n := m.last + 1; n < len(m.names) && m.names[n] == string(name) {
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
