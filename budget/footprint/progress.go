package footprint

import "budgetcheck/budget/unit"

// Progress is how far a part was at one of its work lines.
type Progress struct {
	Done    float64       `json:"done"`       // functional units
	Elapsed unit.Duration `json:"elapsed_ns"` // since the part's start
	KWh     unit.Energy   `json:"kwh"`        // at the meters, measured until then
}

// mostProgress bounds how many work lines are kept: beyond it every second one
// goes, so that a long run keeps an even picture of itself.
const mostProgress = 4096

// progress collects the energy that all meters have measured by each work line.
type progress struct {
	start  unit.Instant
	points []point
	stride int // of how many work lines one is kept
	seen   int
}

type point struct {
	at   unit.Instant
	done float64
	sum  unit.Sum[unit.Joules]
}

// mark notes a work line. Meters that are behind it add to it when they reach
// it, others at the end of what they have covered.
func (g *progress) mark(at unit.Instant, done float64, meters []*meter) {
	g.stride = max(g.stride, 1)
	if g.seen++; (g.seen-1)%g.stride != 0 {
		return
	}
	if len(g.points) == mostProgress {
		g.thin(meters)
	}
	g.points = append(g.points, point{at: at, done: done})
}

// thin keeps every second point.
func (g *progress) thin(meters []*meter) {
	kept := g.points[:0]
	for n := 0; n < len(g.points); n += 2 {
		kept = append(kept, g.points[n])
	}
	g.points, g.stride = kept, 2*g.stride
	for _, m := range meters {
		if m != nil {
			m.next = (m.next + 1) / 2
		}
	}
}

// pass adds to the work lines up to a moment what the meter had measured there:
// what it has so far, and power from p0 on with the slope given.
func (m *meter) pass(to unit.Instant, p0, slope float64) {
	for ; m.next < len(m.marks.points) && m.marks.points[m.next].at <= to; m.next++ {
		p := &m.marks.points[m.next]
		p.sum.Add(m.total.Value())
		p.sum.Add(m.part.Value())
		if length := p.at.Sub(m.at).Seconds(); length > 0 {
			p.sum.Add(unit.Joules((p0 + slope*length/2) * length))
		}
	}
}

// told is the progress as it is kept.
func (g *progress) told() (told []Progress) {
	for _, p := range g.points {
		told = append(told, Progress{p.done, p.at.Sub(g.start), p.sum.Value().Energy()})
	}
	return told
}

// Thinned is every n-th step of the progress, so that at most so many are left,
// and the last.
func Thinned(steps []Progress, most int) []Progress {
	if len(steps) <= most {
		return steps
	}
	stride := (len(steps) + most - 2) / (most - 1)
	var kept []Progress
	for n := 0; n < len(steps)-1; n += stride {
		kept = append(kept, steps[n])
	}
	return append(kept, steps[len(steps)-1])
}
