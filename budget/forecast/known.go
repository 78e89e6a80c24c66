package forecast

import (
	"math"
	"sync"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// Known keeps what landings know of series, for those who ask for many: each
// series is read once, and seen as of each landing's own time. The zero value
// is empty; it is safe for concurrent use.
type Known struct {
	mu   sync.Mutex
	full map[*grid.Series]*hourly
}

// asOf is asOf, from what is kept. k may be nil.
func (k *Known) asOf(s *grid.Series, now unit.Instant) *hourly {
	if k == nil || s == nil {
		return asOf(s, now)
	}
	k.mu.Lock()
	defer k.mu.Unlock()
	if k.full == nil {
		k.full = map[*grid.Series]*hourly{}
	}
	if k.full[s] == nil {
		k.full[s] = asOf(s, last)
	}
	return k.full[s].until(s, now)
}

// until is what of the whole lies before now. It shares the cells.
func (h *hourly) until(s *grid.Series, now unit.Instant) *hourly {
	start, end := s.Span()
	if end = min(end, now); start >= end {
		return &hourly{first: now.Hour(), end: now.Hour()}
	}
	v := hourly{first: h.first, end: min(h.end, (end-1).Hour()+1), cells: h.cells}
	if v.end <= v.first {
		return &hourly{first: now.Hour(), end: now.Hour()}
	}
	if hour := v.end - 1; unit.HourStart(v.end) > end {
		v.cut = h.part(s, hour, end)
	}
	for v.end > v.first && math.IsNaN(v.at(v.end-1)) {
		v.end, v.cut = v.end-1, nil
	}
	return &v
}

// part is an hour of which only what lies before end is known.
func (h *hourly) part(s *grid.Series, hour int64, end unit.Instant) *cell {
	one := &hourly{first: hour, end: hour + 1}
	one.fill(s.Between(unit.HourStart(hour), end), end)
	c := one.cells[0]
	if !math.IsNaN(c.value) {
		c.sum, c.count = c.value, 1
	}
	if before := hour - 24; before >= h.first {
		c.sum += h.cells[before-h.first].sum
		c.count += h.cells[before-h.first].count
	}
	return &c
}
