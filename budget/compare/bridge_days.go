package compare

import (
	"slices"
	"sort"
	"time"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// BridgeDays are mean intensities around the runs of one side.
type BridgeDays struct {
	Zone unit.Intensity // of the runs' zones, over all days of both sides
	Day  unit.Intensity // of the runs' zones, over the days of each run
}

// BridgeRun is where and when a run, or one of its parts, took its energy.
type BridgeRun struct {
	Series   *grid.Series // of its zone; nil where there is none
	From, To unit.Instant
	Facility unit.Energy // its weight in the mean of its side
}

// NewBridgeDays finds the means for both sides, over whole days of loc and
// weighted by energy. A day counts when a run touches it; Zone is over every
// day from the first to the last of either side. Both are nil where a side has
// no energy, or where less than 95 % of a day that is needed is known.
func NewBridgeDays(base, head []BridgeRun, loc *time.Location) (b, h *BridgeDays) {
	runs := slices.Concat(base, head)
	if len(base) == 0 || len(head) == 0 {
		return nil, nil
	}
	first, last := runs[0].From, runs[0].From
	for _, r := range runs {
		first, last = min(first, r.From), max(last, r.lastMoment())
	}
	for _, r := range runs {
		if !r.reaches(first, last) {
			return nil, nil
		}
	}
	c := &bridgeCalendar{bridgeMidnights(first, last, loc), map[*grid.Series][]bridgeDaily{}}
	if b, h = c.side(base), c.side(head); b == nil || h == nil {
		return nil, nil
	}
	return b, h
}

// lastMoment is in the last day that the run touches: a run that ends at
// midnight does not touch the day that begins there.
func (r BridgeRun) lastMoment() unit.Instant { return max(r.From, r.To.Add(-1)) }

// reaches tells whether the run's series can know the days from first to last.
// Where a mistaken time lies centuries off, no days need be counted.
func (r BridgeRun) reaches(first, last unit.Instant) bool {
	if r.Series == nil {
		return false
	}
	from, to := r.Series.Span()
	return from.Add(-unit.Day) <= first && last <= to.Add(unit.Day)
}

// bridgeCalendar is the days of both sides, and the series seen by day.
type bridgeCalendar struct {
	midnights []unit.Instant // the start of each day, and the end of the last
	series    map[*grid.Series][]bridgeDaily
}

// bridgeMidnights are the starts of the local days from the one of first to
// the one after last.
func bridgeMidnights(first, last unit.Instant, loc *time.Location) (m []unit.Instant) {
	year, month, day := first.Time().In(loc).Date()
	for len(m) == 0 || m[len(m)-1] <= last {
		m = append(m, bridgeMidnight(year, month, day+len(m), loc))
	}
	return m
}

// bridgeMidnight is when a local day begins. Where clocks skip midnight it is
// when they have done so; time.Date may then give an hour of the day before.
func bridgeMidnight(year int, month time.Month, day int, loc *time.Location) unit.Instant {
	t := time.Date(year, month, day, 0, 0, 0, 0, loc)
	if _, skip := t.ZoneBounds(); t.Hour() > 12 {
		t = skip
	}
	return unit.At(t)
}

// side is the mean over the runs of a side.
func (c *bridgeCalendar) side(runs []BridgeRun) *BridgeDays {
	var zone, day, weight unit.Sum[float64]
	for _, r := range runs {
		days := c.daily(r.Series)
		if days == nil {
			return nil
		}
		from, to := c.day(r.From), c.day(r.lastMoment())
		weight.Add(float64(r.Facility))
		zone.Add(float64(r.Facility) * bridgeMean(days))
		day.Add(float64(r.Facility) * bridgeMean(days[from:to+1]))
	}
	if weight.Value() <= 0 {
		return nil
	}
	return &BridgeDays{Zone: unit.Intensity(zone.Value() / weight.Value()), Day: unit.Intensity(day.Value() / weight.Value())}
}

// day is the index of the day of t.
func (c *bridgeCalendar) day(t unit.Instant) int {
	return sort.Search(len(c.midnights), func(n int) bool { return c.midnights[n] > t }) - 1
}
