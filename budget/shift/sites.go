package shift

import (
	"budgetcheck/budget/unit"
)

// Site is a place where the run may be moved.
type Site struct {
	Place
	PerKWh  *float64  // price of facility energy, in any one currency; nil if not known
	PerHour *float64  // price of an hour of the machine; nil if not known
	Moves   float64   // GB to move there; 0 for the site where the data is
	PerGB   unit.Mass // emissions of moving one GB
}

// Row is what the run would emit and cost at a site. A figure is nil where it
// has no price.
type Row struct {
	Site      string        `json:"site"`
	Zone      string        `json:"zone,omitempty"`
	Total     *unit.Mass    `json:"total_g,omitempty"` // at the run's own start
	Best      *unit.Mass    `json:"best_start_total_g,omitempty"`
	BestStart *unit.Instant `json:"-"`
	Cost      *float64      `json:"cost,omitempty"`
	Moves     float64       `json:"moves_gb"`
	Efficient bool          `json:"efficient"` // no other row is better in one and as good in the other
}

// Sites compares sites. Emissions of moving data are in the totals. A row is
// efficient (Pareto) by the total at its best start and by cost; cost counts
// only where every row has one.
func Sites(r Run, sites []Site, window unit.Duration) []Row {
	rows := make([]Row, len(sites))
	for n, s := range sites {
		rows[n] = s.row(r, window)
	}
	markEfficient(rows)
	return rows
}

func (s Site) row(r Run, window unit.Duration) Row {
	row := Row{Site: s.Name, Cost: s.cost(r), Moves: s.Moves}
	if s.Series != nil {
		row.Zone = s.Series.Zone
	}
	if total, ok := Total(r, s.Place, r.Start); ok {
		total += s.moving()
		row.Total = &total
	}
	if d := DeferredStart(r, s.Place, window); d != nil {
		d.Total += s.moving()
		row.Best, row.BestStart = &d.Total, &d.Start
	}
	return row
}

func (s Site) moving() unit.Mass { return unit.Mass(s.Moves) * s.PerGB }

// cost adds the prices that are known.
func (s Site) cost(r Run) *float64 {
	if s.PerKWh == nil && s.PerHour == nil {
		return nil
	}
	var cost float64
	if s.PerKWh != nil {
		cost += *s.PerKWh * float64(r.Profile.Energy()) * s.PUE
	}
	if s.PerHour != nil {
		cost += *s.PerHour * r.Profile.duration.Seconds() / unit.Hour.Seconds()
	}
	return &cost
}

func markEfficient(rows []Row) {
	priced := true
	for _, row := range rows {
		priced = priced && row.Cost != nil
	}
	for n := range rows {
		rows[n].Efficient = rows[n].Best != nil
		for _, other := range rows {
			if rows[n].Efficient && other.Best != nil && other.beats(rows[n], priced) {
				rows[n].Efficient = false
			}
		}
	}
}

// beats tells whether the row is better in one figure and as good in the other.
func (row Row) beats(other Row, priced bool) bool {
	emits := compare(float64(*row.Best), float64(*other.Best))
	costs := 0
	if priced {
		costs = compare(*row.Cost, *other.Cost)
	}
	return min(emits, costs) < 0 && max(emits, costs) <= 0
}

// compare takes figures for equal that differ by rounding.
func compare(a, b float64) int {
	limit := tie * max(a, b, -a, -b)
	switch {
	case a < b-limit:
		return -1
	case a > b+limit:
		return 1
	}
	return 0
}
