package compare

import (
	"sort"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// bridgeDaily is what a series knows of one local day.
type bridgeDaily struct {
	known    unit.Duration
	integral unit.Sum[float64] // of intensity over the time known, g/kWh x s
}

// bridgeLeast is how much of a day must be known, %.
const bridgeLeast = 95

// daily is the series by day; nil where a day is not known. A series is walked
// through once, however many runs it prices.
func (c *bridgeCalendar) daily(s *grid.Series) []bridgeDaily {
	days, seen := c.series[s]
	if !seen {
		days = bridgeByDay(s.Steps(), c.midnights)
		c.series[s] = days
	}
	return days
}

// bridgeByDay cuts steps at midnights; nil where less than 95 % of a day is known.
func bridgeByDay(steps []grid.Interval, midnights []unit.Instant) []bridgeDaily {
	days := make([]bridgeDaily, len(midnights)-1)
	n := sort.Search(len(steps), func(n int) bool { return steps[n].To > midnights[0] })
	for d := range days {
		from, to := midnights[d], midnights[d+1]
		for ; n < len(steps) && steps[n].From < to; n++ {
			days[d].add(max(from, steps[n].From), min(to, steps[n].To), steps[n].I)
			if steps[n].To > to { // the next day has the rest
				break
			}
		}
		if days[d].known < to.Sub(from)/100*bridgeLeast {
			return nil
		}
	}
	return days
}

func (d *bridgeDaily) add(from, to unit.Instant, i unit.Intensity) {
	d.known += to.Sub(from)
	d.integral.Add(float64(i) * to.Sub(from).Seconds())
}

// bridgeMean is the mean over the time of the days that is known, g/kWh.
func bridgeMean(days []bridgeDaily) float64 {
	var known unit.Duration
	var integral unit.Sum[float64]
	for n := range days {
		known += days[n].known
		integral.Add(days[n].integral.Value())
	}
	return integral.Value() / known.Seconds()
}
