package footprint

import (
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// meter integrates one meter's lines over the timeline, in time order.
type meter struct {
	kind   record.Kind
	line   *timeline
	maxGap unit.Duration
	rated  float64 // W that no reading should pass; 0 if not known

	at      unit.Instant // up to here everything is accounted for
	bucket  int          // the bucket in which at lies
	started bool         // a first sample was seen
	power   float64      // W at the last sample, or over the last covered interval
	joules  unit.Joules  // the counter's last reading
	read    unit.Instant // its time; later than at while the first edge is open
	sure    bool         // the counter's last interval was covered: its power holds to the end

	part    unit.Sum[unit.Joules] // measured in the current bucket
	total   unit.Sum[unit.Joules]
	covered unit.Duration
	low     float64 // least and greatest covered power, W
	high    float64
	gaps    []gap

	estimated bool // what is in part

	marks *progress // where the work lines stand
	next  int       // the first of them that this meter has not reached

	above      int // readings above rated
	firstAbove record.Line
}

// gap is a time that a meter does not cover.
type gap struct {
	from, to unit.Instant
	bucket   int // in which it starts
}

// sample takes a power reading: linear from the last one, if that is near.
func (m *meter) sample(l *record.Line) {
	p := float64(l.Power)
	m.plausible(p, l)
	m.reach(l.At, p)
}

// reach moves to a moment at which the power is p.
func (m *meter) reach(at unit.Instant, p float64) {
	from := m.power
	if !m.started {
		from = p // the edge from open holds the first sample
	}
	if at.Sub(m.at) > m.maxGap {
		m.skip(at)
	} else {
		m.cover(at, from, p)
	}
	m.power, m.started = p, true
}

// count takes a counter's reading: constant power since the last one.
func (m *meter) count(l *record.Line) {
	if !m.started {
		m.started, m.read, m.joules = true, l.At, l.Joules
		return
	}
	length := l.At.Sub(m.read)
	var grown unit.Joules
	if grown, m.sure = m.grown(l.Joules, l.Wrap, length); m.sure {
		p := float64(grown) / length.Seconds()
		m.plausible(p, l)
		m.edge(p)
		m.cover(l.At, p, p)
		m.power = p
	} else {
		m.skip(l.At)
	}
	m.read, m.joules = l.At, l.Joules
}

// edge covers the time from open to a counter's first reading, once its power
// is known.
func (m *meter) edge(p float64) {
	if m.at == m.read {
		return
	}
	if m.read.Sub(m.at) > m.maxGap {
		m.skip(m.read)
		return
	}
	m.cover(m.read, p, p)
}

// grown is what the counter counted up to the reading j; ok is false where
// that is not certain: it was reset, or may have wrapped more than once.
func (m *meter) grown(j, wrap unit.Joules, length unit.Duration) (grown unit.Joules, ok bool) {
	fell := j < m.joules
	switch {
	case fell && wrap == 0:
		return 0, false
	case wrap > 0 && m.rated > 0 && unit.Joules(m.rated*length.Seconds()) >= wrap:
		return 0, false
	case fell && m.rated == 0 && length > m.maxGap:
		return 0, false
	case fell:
		return wrap - m.joules + j, true
	}
	return j - m.joules, true
}

// used takes a total over a span, as constant power.
func (m *meter) used(l *record.Line) {
	if estimated := !l.Used.Measured; estimated != m.estimated {
		m.flush()
		m.estimated = estimated
	}
	p := float64(l.Used.Energy) * unit.JoulesPerKWh / l.Used.To.Sub(l.Used.From).Seconds()
	m.plausible(p, l)
	m.reach(l.Used.From, p)
	m.cover(l.Used.To, p, p)
}

func (m *meter) plausible(p float64, l *record.Line) {
	if m.rated > 0 && p > m.rated*(1+rounding) {
		if m.above == 0 {
			m.firstAbove = *l
			m.firstAbove.Power = unit.Power(p)
		}
		m.above++
	}
}

// finish accounts for the edge from the last sample to the end of the part.
func (m *meter) finish(end unit.Instant) {
	m.started = true
	if end.Sub(m.at) > m.maxGap || m.kind == record.KindEnergy && !m.sure {
		m.skip(end)
	} else {
		m.cover(end, m.power, m.power)
	}
	m.pass(end, 0, 0)
	m.flush()
}

// cover adds the energy up to the moment to, power going linearly from p0 to
// p1, split where the price changes.
func (m *meter) cover(to unit.Instant, p0, p1 float64) {
	start, length := m.at, to.Sub(m.at).Seconds()
	if length <= 0 {
		return
	}
	m.extremes(p0, p1)
	m.covered += to.Sub(start)
	slope := (p1 - p0) / length
	if m.next < len(m.marks.points) {
		m.pass(to, p0, slope)
	}
	for p, rest := p0, length; ; rest = to.Sub(m.at).Seconds() {
		b := m.line.at(m.bucket)
		if to <= b.to {
			m.part.Add(unit.Joules((p + p1) / 2 * rest))
			m.at = to
			return
		}
		pEnd := p0 + slope*b.to.Sub(start).Seconds()
		m.part.Add(unit.Joules((p + pEnd) / 2 * b.to.Sub(m.at).Seconds()))
		m.at, p = b.to, pEnd
		m.flush()
		m.bucket++
	}
}

func (m *meter) extremes(p0, p1 float64) {
	if m.covered == 0 {
		m.low, m.high = p0, p0
	}
	m.low = min(m.low, p0, p1)
	m.high = max(m.high, p0, p1)
}

// skip leaves a gap up to the moment to.
func (m *meter) skip(to unit.Instant) {
	if to <= m.at {
		return
	}
	if n := len(m.gaps); n > 0 && m.gaps[n-1].to == m.at {
		m.gaps[n-1].to = to
	} else {
		m.gaps = append(m.gaps, gap{m.at, to, m.bucket})
	}
	m.flush()
	m.pass(to, 0, 0)
	for m.line.at(m.bucket).to < to {
		m.bucket++
	}
	m.at = to
}

// missing visits the buckets that the meter's gaps touch, with the time that it
// does not cover there.
func (m *meter) missing(visit func(b *bucket, length unit.Duration)) {
	for _, g := range m.gaps {
		for n := g.bucket; n < len(m.line.buckets) && m.line.buckets[n].from < g.to; n++ {
			b := &m.line.buckets[n]
			visit(b, b.overlap(g.from, g.to))
		}
	}
}

// flush moves what was measured in the current bucket to the timeline.
func (m *meter) flush() {
	j := m.part.Value()
	m.part = unit.Sum[unit.Joules]{}
	m.total.Add(j)
	if m.bucket == len(m.line.buckets) {
		return // nothing was measured yet
	}
	b := &m.line.buckets[m.bucket]
	b.measured.Add(j)
	if !m.estimated {
		b.proven.Add(j)
	}
}

// fill spreads the meter's mean covered power over its gaps. It gives the
// energy filled.
func (m *meter) fill() (filled unit.Joules) {
	var sum unit.Sum[unit.Joules]
	mean := m.mean()
	m.missing(func(b *bucket, length unit.Duration) {
		j := unit.Joules(mean * length.Seconds())
		b.filled.Add(j)
		sum.Add(j)
	})
	return sum.Value()
}

// mean is the mean power over the covered time, W.
func (m *meter) mean() float64 {
	if m.covered == 0 {
		return 0
	}
	return float64(m.total.Value()) / m.covered.Seconds()
}
