package forecast

import (
	"math"
	"slices"

	"budgetcheck/budget/unit"
)

// slot is an hour and how many runs, or parts of one, draw their energy in it.
type slot struct {
	hour   int64
	weight float64
}

// slots are the hours of runs of one length that start at the given firings.
func slots(firings []firing, length unit.Duration) []slot {
	weight := map[int64]float64{}
	for _, f := range firings {
		hours := hoursOf(f.at, length)
		for _, h := range hours {
			weight[h] += f.weight / float64(len(hours))
		}
	}
	slots := make([]slot, 0, len(weight))
	for h, w := range weight {
		slots = append(slots, slot{h, w})
	}
	slices.SortFunc(slots, func(a, b slot) int { return int(a.hour - b.hour) })
	return slots
}

// hoursOf cuts a run into equal parts of up to an hour and tells the hour in
// which the middle of each lies.
func hoursOf(at unit.Instant, length unit.Duration) []int64 {
	parts := max((length+unit.Hour-1)/unit.Hour, 1)
	part := length / parts
	hours := make([]int64, parts)
	for n := range hours {
		hours[n] = (at.Add(part*unit.Duration(n) + part/2)).Hour()
	}
	return hours
}

// backtest tells how well the intensity of the slots is foretold. For every past
// day of the series it makes the same prediction as of that day: the slots moved
// back by whole days, with what was known then, so with the same lead. The error
// is that of the weighted mean over the slots, relative to the prediction; rms
// is the root of its mean square. ok is false where it cannot be told of any day.
func (h *hourly) backtest(slots []slot) (rms float64, ok bool) {
	days := 0
	var squares unit.Sum[float64]
	ahead := slots[len(slots)-1].hour - h.end
	for back := max(ahead/24+1, 1); h.end-24*back > h.first; back++ {
		if e, ok := h.miss(slots, 24*back); ok {
			squares.Add(e * e)
			days++
		}
	}
	return math.Sqrt(squares.Value() / max(float64(days), 1)), days > 0
}

// A past day counts if this share of its slots is known.
const leastTold = 0.8

// miss is the relative error of the prediction made some hours back.
func (h *hourly) miss(slots []slot, back int64) (e float64, ok bool) {
	var foretold, came, told, all float64
	for _, s := range slots {
		all += s.weight
		v := h.at(s.hour - back)
		i, ok := h.expected(s.hour-back, h.end-back)
		if ok && !math.IsNaN(v) {
			foretold += s.weight * i
			came += s.weight * v
			told += s.weight
		}
	}
	if told < leastTold*all || foretold <= 0 {
		return 0, came <= 0 && told >= leastTold*all && all > 0
	}
	return came/foretold - 1, true
}
