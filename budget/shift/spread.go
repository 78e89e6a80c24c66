package shift

import (
	"math"
	"slices"
	"time"

	"budgetcheck/budget/unit"
)

// Spread is how the run's total is distributed over the starts at one site.
// Quartiles are interpolated linearly (Hyndman & Fan 1996, Am. Stat. 50:361,
// type 7).
type Spread struct {
	Site   string     `json:"site"`
	Min    unit.Mass  `json:"min_g"`
	Q1     unit.Mass  `json:"q1_g"`
	Mean   unit.Mass  `json:"mean_g"`
	Median unit.Mass  `json:"median_g"`
	Q3     unit.Mass  `json:"q3_g"`
	Max    unit.Mass  `json:"max_g"`
	Starts int        `json:"starts"`
	Below  unit.Share `json:"-"` // of the starts, those with less than Stood; 0 if it is nil
	Stood  *unit.Mass `json:"-"` // the run as it was; nil where that has no price
}

// Spreads prices the run at every site at the same starts: each full hour of
// the whole local days that all series span, where the run meets no hole of
// any. It is nil if there is no such hour. Emissions of moving data are in.
func Spreads(r Run, sites []Site, zone *time.Location) []Spread {
	totals := make([][]float64, len(sites))
	tables := map[unit.Duration][]float64{}
	for _, start := range fullHours(sites, zone) {
		row, ok := priceAll(r, sites, start, tables)
		if !ok {
			continue
		}
		for n, g := range row {
			totals[n] = append(totals[n], g)
		}
	}
	if len(totals) == 0 || len(totals[0]) == 0 {
		return nil
	}
	spreads := make([]Spread, len(sites))
	for n, s := range sites {
		spreads[n] = s.spread(r, totals[n])
	}
	return spreads
}

// priceAll is the run's total at every site for one start, none if one is missing.
func priceAll(r Run, sites []Site, start unit.Instant, tables map[unit.Duration][]float64) ([]float64, bool) {
	until := r.Profile.reader(tables)
	row := make([]float64, len(sites))
	for n, s := range sites {
		g, ok := charge(r.Profile, s.Series, start, until)
		if !ok {
			return nil, false
		}
		row[n] = float64(r.total(s.Place, g) + s.moving())
	}
	return row, true
}

// reader is until, read from a table for moments that lie whole seconds apart
// from the first asked for.
func (p Profile) reader(tables map[unit.Duration][]float64) func(unit.Duration) float64 {
	var table []float64
	fraction := unit.Duration(-1)
	return func(at unit.Duration) float64 {
		if at == p.duration {
			return p.until(at)
		}
		if fraction < 0 {
			fraction = at % unit.Second
			if tables[fraction] == nil {
				tables[fraction] = p.table(fraction)
			}
			table = tables[fraction]
		}
		if at%unit.Second != fraction {
			return p.until(at)
		}
		return table[len(table)-1-int(at/unit.Second)]
	}
}

func (s Site) spread(r Run, totals []float64) Spread {
	var sum unit.Sum[unit.Mass]
	for _, g := range totals {
		sum.Add(unit.Mass(g))
	}
	slices.Sort(totals)
	n := len(totals)
	sp := Spread{Site: s.Name, Starts: n, Mean: sum.Value() / unit.Mass(n), Min: unit.Mass(totals[0]), Max: unit.Mass(totals[n-1]),
		Q1: quantile(totals, 0.25), Median: quantile(totals, 0.5), Q3: quantile(totals, 0.75)}
	if was, ok := Total(r, s.Place, r.Start); ok {
		was += s.moving()
		below, _ := slices.BinarySearch(totals, float64(was)*(1-tie))
		sp.Stood, sp.Below = &was, unit.Share(float64(below)/float64(n))
	}
	return sp
}

// quantile is that of sorted values by Hyndman & Fan's type 7: value p (n - 1),
// counted from 0.
func quantile(sorted []float64, p float64) unit.Mass {
	at := p * float64(len(sorted)-1)
	low := sorted[int(at)]
	high := sorted[min(int(at)+1, len(sorted)-1)]
	return unit.Mass(low + (high-low)*(at-math.Floor(at)))
}

// fullHours are the full local hours of the whole local days within the span of
// every series.
func fullHours(sites []Site, zone *time.Location) (hours []unit.Instant) {
	from, to := unit.Instant(math.MinInt64), unit.Instant(math.MaxInt64)
	for _, s := range sites {
		if s.Series == nil {
			return nil
		}
		first, end := s.Series.Span()
		from, to = max(from, first), min(to, end)
	}
	if len(sites) == 0 {
		return nil
	}
	for day := from.Time().In(zone); ; {
		begin, next := midnights(day)
		if next.After(to.Time()) {
			return hours
		}
		if !begin.Before(from.Time()) {
			hours = append(hours, hoursOf(begin, next)...)
		}
		day = next // always later
	}
}

// midnights are the start of a moment's local day and of the next.
func midnights(t time.Time) (begin, next time.Time) {
	y, m, d := t.Date()
	return dayStart(y, m, d, t.Location()), dayStart(y, m, d+1, t.Location())
}

// dayStart is the first moment of a day. Where the clock is set forward at
// midnight there is no 0:00, and time.Date may land in the evening before.
func dayStart(y int, m time.Month, d int, zone *time.Location) time.Time {
	t := time.Date(y, m, d, 0, 0, 0, 0, zone)
	if noon := time.Date(y, m, d, 12, 0, 0, 0, zone); t.Day() != noon.Day() {
		_, t = t.ZoneBounds()
	}
	return t
}

// hoursOf steps through a day of 23, 24 or 25 hours. Where the clock is set by
// half an hour, it goes on at the next full one.
func hoursOf(begin, next time.Time) (hours []unit.Instant) {
	for t := begin; t.Before(next); t = t.Add(time.Hour - time.Duration(t.Minute())*time.Minute) {
		if t.Minute() == 0 {
			hours = append(hours, unit.At(t))
		}
	}
	return hours
}
