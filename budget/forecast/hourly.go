package forecast

import (
	"math"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// The expected intensity looks at the same hour of the last four weeks, like
// grid.Series.Expected.
const (
	lookBack   = 28
	leastKnown = 7
)

// Hours that are older say little of today's grid; the limit bounds memory.
const memory = 10 * unit.Year

// hourly is what is known of a series at one moment: its mean in each hour of
// UTC. Hours are counted from 1970; each follows in a column the same hour of
// the day before.
type hourly struct {
	first, end int64 // the first hour, and the first that is not known any more
	cells      []cell
	cut        *cell // instead of the last one, which now cuts; nil if it does not
}

// cell is one hour.
type cell struct {
	value float64 // NaN in a hole
	sum   float64 // of the known values of the column so far; while it is filled, the part of the hour that is
	count int     // of the known values of the column so far
}

// asOf keeps what lies before now. s may be nil.
func asOf(s *grid.Series, now unit.Instant) *hourly {
	h := &hourly{first: now.Hour(), end: now.Hour()}
	if s == nil {
		return h
	}
	start, end := s.Span()
	if end = min(end, now); start >= end {
		return h
	}
	h.first, h.end = (max(start, end.Add(-memory))).Hour(), (end-1).Hour()+1
	h.fill(s.Steps(), end)
	h.total()
	return h
}

// fill takes the time mean of the steps in each hour.
func (h *hourly) fill(steps []grid.Interval, end unit.Instant) {
	h.cells = make([]cell, h.end-h.first)
	for _, s := range steps {
		s.From, s.To = max(s.From, unit.HourStart(h.first)), min(s.To, end)
		for s.From < s.To {
			hour := s.From.Hour()
			until := min(s.To, unit.HourStart(hour+1))
			part := float64(until-s.From) / float64(unit.Hour)
			c := &h.cells[hour-h.first]
			c.value += part * float64(s.I)
			c.sum += part
			s.From = until
		}
	}
	for n := range h.cells {
		h.cells[n].settle()
	}
	for h.end > h.first && math.IsNaN(h.cells[h.end-1-h.first].value) {
		h.end--
	}
}

// settle ends the filling. An hour of which less than half is known is a hole.
func (c *cell) settle() {
	if c.value /= c.sum; c.sum < 0.5 {
		c.value = math.NaN()
	}
	c.sum = 0
}

// total sums up the columns, so that an expected value costs no loop.
func (h *hourly) total() {
	for n := range h.cells {
		c := &h.cells[n]
		if !math.IsNaN(c.value) {
			c.sum, c.count = c.value, 1
		}
		if n >= 24 {
			c.sum += h.cells[n-24].sum
			c.count += h.cells[n-24].count
		}
	}
}

// at is the value of an hour, NaN where it is not known.
func (h *hourly) at(hour int64) float64 {
	if hour < h.first || hour >= h.end {
		return math.NaN()
	}
	return h.cell(hour).value
}

// cell is that of a known hour.
func (h *hourly) cell(hour int64) *cell {
	if h.cut != nil && hour == h.end-1 {
		return h.cut
	}
	return &h.cells[hour-h.first]
}

// nights is how many values of the column of an hour are known.
func (h *hourly) nights(hour int64) int {
	back := (hour - h.end + 24) / 24 // days back to the last of the column
	_, n := h.column(hour - 24*max(back, 0))
	return n
}

// column is the sum and the count of the known values of an hour and of the
// same hour of all days before it.
func (h *hourly) column(hour int64) (float64, int) {
	if hour < h.first || hour >= h.end {
		return 0, 0
	}
	c := h.cell(hour)
	return c.sum, c.count
}

// expected is the intensity that was expected for an hour when the hours before
// origin were known: the mean of the same hour on those of the 28 days before it
// that were known. Far ahead these are fewer than 7; then it is the mean of the
// latest 7 in the 28 days before origin. A known hour is its own expectation.
func (h *hourly) expected(hour, origin int64) (i float64, ok bool) {
	nearest := int64(1)
	if hour < origin {
		if v := h.at(hour); !math.IsNaN(v) {
			return v, true
		}
	} else {
		nearest = (hour-origin)/24 + 1
	}
	sum, n := h.column(hour - 24*nearest)
	before, m := h.column(hour - 24*(max(lookBack, nearest+leastKnown-1)+1))
	if n -= m; n >= leastKnown {
		return (sum - before) / float64(n), true
	}
	return h.latest(hour - 24*nearest)
}

// latest is the mean of the latest 7 known values in 28 days of a column.
func (h *hourly) latest(hour int64) (i float64, ok bool) {
	var sum float64
	n := 0
	for k := int64(0); k < lookBack; k++ {
		if v := h.at(hour - 24*k); !math.IsNaN(v) {
			sum += v
			if n++; n == leastKnown {
				return sum / leastKnown, true
			}
		}
	}
	return 0, false
}
