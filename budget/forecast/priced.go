package forecast

import (
	"fmt"

	"gonum.org/v1/gonum/stat"

	"budgetcheck/budget/unit"
)

// mass is the estimate in g. h is the job's series as known now.
func (j Job) mass(p Period, now unit.Instant, h *hourly) *estimate {
	e := j.estimate(p, now)
	if e.runs == 0 || !e.told {
		return e
	}
	if g, ok := e.outlook(h); ok {
		e.priced(g)
	} else {
		e.totals(h)
	}
	e.counted(stat.Mean(e.values(total), nil))
	return e
}

// The back-test wants four weeks and three times the horizon.
const horizons = 3

// outlook is what the grid is expected to do at the hours of the runs left.
type outlook struct {
	length unit.Duration     // of a run
	price  map[int64]float64 // expected, by hour
	sum    float64           // over the runs left, of the expected intensity
	miss   float64           // root mean square relative error of past predictions of sum
	df     float64           // of miss
}

// outlook looks ahead. ok is false if the series is too short for that.
func (e *estimate) outlook(h *hourly) (o outlook, ok bool) {
	o.length = length(e.past)
	slots := slots(e.firings, o.length)
	from, to := slots[0].hour, slots[len(slots)-1].hour
	nights := h.nights(from)
	horizon := max((to-h.end)/24+1, 1)
	if int64(nights) < lookBack+horizons*horizon {
		return o, false
	}
	if o.price, o.sum, ok = h.prices(slots); !ok {
		return o, false
	}
	// Past windows as long as this one that do not overlap are independent.
	o.df = max(float64((int64(nights)-lookBack)/((to-from)/24+1)), 2)
	o.miss, ok = h.backtest(slots)
	return o, ok
}

// prices is the intensity expected at each slot, and the sum by weight.
func (h *hourly) prices(slots []slot) (price map[int64]float64, sum float64, ok bool) {
	var total unit.Sum[float64]
	price = make(map[int64]float64, len(slots))
	for _, s := range slots {
		i, ok := h.expected(s.hour, h.end)
		if !ok {
			return nil, 0, false
		}
		price[s.hour] = i
		total.Add(i * s.weight)
	}
	return price, total.Value(), true
}

// of is the intensity expected over a run.
func (o outlook) of(f firing) float64 {
	hours := hoursOf(f.at, o.length)
	var sum float64
	for _, h := range hours {
		sum += o.price[h]
	}
	return sum / float64(len(hours))
}

// priced prices the mean energy with the intensity expected at the hours left:
//
//	expected = sum of (E x I + M)
//	variance = (m E I e)^2 + (I s_E)^2 (m + m^2/n) + (m E I s_ratio)^2
//
// with m runs left, n past ones, and m I the sum of the outlook.
func (e *estimate) priced(o outlook) {
	energy, noise := e.each(e.values(facility), 0)
	constant := e.mean(embodied)
	e.price(func(f firing) float64 { return energy*o.of(f) + constant })
	e.miss = &o.miss
	e.weather = share{energy * o.sum * o.miss, o.df}
	e.noise = share{noise.u * o.sum / e.runs, noise.df}
	e.ratio = share{e.mean(facility) * o.sum * e.job.RatioU, e.job.ratioDF()}
}

// totals lets the totals of past runs stand for the next, weather and all, with
// as many independent values as their autocorrelation leaves.
func (e *estimate) totals(h *hourly) {
	x := e.values(total)
	each, spread := e.each(x, persistence(x))
	e.price(func(firing) float64 { return each })
	e.weather = spread
	e.ratio = share{e.runs * e.mean(total) * e.job.RatioU, e.job.ratioDF()}
	if !e.spread {
		return // a worse note stands already
	}
	e.note = fmt.Sprintf("grid known from %d nights only", h.nights((e.firings[0].at).Hour()))
	if e.job.Zone != "" {
		e.note = e.job.Zone + ": " + e.note
	}
}
