package shift

import (
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// tie is how far, relatively, two totals may lie apart and count as equal.
const tie = 1e-9

// rounding is what sums of floats may be off by, relative to their terms.
const rounding = 1e-13

// Deferred is the best deferred start.
type Deferred struct {
	Site   string       `json:"site"`
	Start  unit.Instant `json:"start"`
	Total  unit.Mass    `json:"total_g"`
	Saves  *unit.Mass   `json:"saves_g,omitempty"` // against the run as it was; nil where that has no price
	Window float64      `json:"window_s"`
}

// DeferredStart is the start with the least total among those at whole seconds
// from the run's own start to window later, both included; of totals within
// 1e-9 the earliest. The run may end after the window. A start whose run meets
// a hole or an end of the series is none; nil if there is no other.
func DeferredStart(r Run, at Place, window unit.Duration) *Deferred {
	if at.Series == nil || window < 0 {
		return nil
	}
	s := scan{run: r, at: at, last: int(window / unit.Second), tables: map[unit.Duration][]float64{}}
	for _, part := range unbroken(at.Series.Between(r.Start, r.Start.Add(window).Add(r.Profile.duration))) {
		s.part(part)
	}
	if len(s.lows) == 0 {
		return nil
	}
	d := &Deferred{Site: at.Name, Start: s.instant(s.earliest()), Window: window.Seconds()}
	d.Total, _ = Total(r, at, d.Start)
	d.Saves = saves(r, at, d.Total)
	return d
}

func saves(r Run, at Place, total unit.Mass) *unit.Mass {
	was, ok := Total(r, at, r.Start)
	if !ok {
		return nil
	}
	was -= total
	return &was
}

// scan prices all starts, which are counted in seconds from the run's own.
//
// A step function is its last value and its jumps: the charge of a start is that
// of the whole energy at the intensity of the run's end, and for each change of
// intensity within the run the energy before it times the fall. So each change
// costs one product a start, whatever the profile.
type scan struct {
	run    Run
	at     Place
	last   int
	tables map[unit.Duration][]float64 // by fraction of a second
	lows   []low
	peak   float64 // the highest intensity met
}

// low is a start that is better than all before it. The earliest of those that
// are as good as the best is always one.
type low struct {
	start int
	total float64
}

// batch is how many starts are priced together; their sums stay in the cache.
const batch = 1 << 14

func (s *scan) instant(start int) unit.Instant {
	return s.run.Start.Add(unit.Duration(start) * unit.Second)
}

// part prices the starts whose run fits an unbroken part of the series.
func (s *scan) part(steps []grid.Interval) {
	d := s.run.Profile.duration
	first := max(0, ceil(steps[0].From.Sub(s.run.Start)))
	last := min(s.last, floor(steps[len(steps)-1].To.Sub(s.run.Start)-d))
	for _, in := range steps {
		s.peak = max(s.peak, float64(in.I))
	}
	for ; first <= last; first += batch {
		s.batch(first, make([]float64, min(batch, last-first+1)), steps)
	}
}

func (s *scan) batch(first int, sums []float64, steps []grid.Interval) {
	s.ends(first, sums, steps)
	for n := 1; n < len(steps); n++ {
		if fall := float64(steps[n-1].I - steps[n].I); fall != 0 {
			s.change(first, sums, steps[n].From.Sub(s.run.Start), fall)
		}
	}
	for n, g := range sums {
		total := float64(s.run.total(s.at, g))
		if k := len(s.lows); k == 0 || total < s.lows[k-1].total {
			s.lows = append(s.lows, low{first + n, total})
		}
	}
}

// ends charges the whole energy with the intensity at the end of each run.
func (s *scan) ends(first int, sums []float64, steps []grid.Interval) {
	energy, n := float64(s.run.Profile.Energy()), 0
	for k := range sums {
		end := s.instant(first + k).Add(s.run.Profile.duration)
		for steps[n].To < end {
			n++
		}
		sums[k] = energy * float64(steps[n].I)
	}
}

// change adds what the energy before a change of intensity is charged more. The
// change is at a time after the run's own start.
func (s *scan) change(first int, sums []float64, at unit.Duration, fall float64) {
	from := max(first, floor(at-s.run.Profile.duration)+1)
	to := min(first+len(sums)-1, floor(at))
	if from > to {
		return
	}
	into := at - unit.Duration(from)*unit.Second
	table := s.table(into % unit.Second)
	table = table[len(table)-1-int(into/unit.Second):]
	sums = sums[from-first : to-first+1]
	table = table[:len(sums)]
	for n, energy := range table {
		sums[n] += fall * energy
	}
}

func (s *scan) table(fraction unit.Duration) []float64 {
	t, ok := s.tables[fraction]
	if !ok {
		t = s.run.Profile.table(fraction)
		s.tables[fraction] = t
	}
	return t
}

// earliest is the first start as good as the best. A charge of zero comes out
// as rounding of its large terms, hence the second term of the limit.
func (s *scan) earliest() int {
	least := s.lows[len(s.lows)-1].total
	limit := least*(1+tie) + rounding*s.peak*float64(s.run.Profile.Energy())*s.at.PUE
	for _, l := range s.lows {
		if l.total <= limit {
			return l.start
		}
	}
	return s.lows[len(s.lows)-1].start
}

// floor is the number of whole seconds that end by d.
func floor(d unit.Duration) int {
	n := int(d / unit.Second)
	if d%unit.Second < 0 {
		n--
	}
	return n
}

func ceil(d unit.Duration) int { return -floor(-d) }
