package compare_test

import (
	"math/rand/v2"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"pgregory.net/rapid"

	"budgetcheck/budget/compare"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// bridgeSlot is how finely the reckoning below looks; all moments are multiples of it.
const bridgeSlot = 15 * unit.Minute

// bridgeSlots are the slots of a series in each local day: it asks the clock on
// the wall at every one, and knows nothing of midnights.
func bridgeSlots(s *grid.Series, from, to unit.Instant, loc *time.Location) map[string][]float64 {
	days := map[string][]float64{}
	for at := from; at < to; at = at.Add(bridgeSlot) {
		date := at.Time().In(loc).Format(time.DateOnly)
		v := -1.0 // not known
		if i, ok := s.At(at); ok {
			v = float64(i)
		}
		days[date] = append(days[date], v)
	}
	return days
}

// bridgeSlotMean is the mean over the days from one date to another; ok is
// false where less than 95 % of one is known.
func bridgeSlotMean(days map[string][]float64, from, to string) (mean float64, ok bool) {
	var sum, all float64
	for date, slots := range days {
		if date < from || date > to {
			continue
		}
		known := 0.0
		for _, v := range slots {
			if v >= 0 {
				sum, known = sum+v, known+1
			}
		}
		if known < 0.95*float64(len(slots)) {
			return 0, false
		}
		all += known
	}
	return sum / all, true
}

// TestBridgeDaysAgainstSlots compares with a reckoning that goes through time
// slot by slot, around changes of clocks and with holes in the series.
func TestBridgeDaysAgainstSlots(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		loc := bridgeZoneOf(t, rapid.SampledFrom([]string{"UTC", "Europe/Berlin", "America/New_York", "Asia/Kolkata", "America/Santiago",
			"Australia/Lord_Howe", "Atlantic/Azores", "America/Havana", "Africa/Cairo"}).Draw(t, "zone"))
		start := bridgeAt(t, rapid.SampledFrom([]string{"2031-03-07T00:00:00Z", "2031-03-28T00:00:00Z", "2031-04-04T00:00:00Z", "2031-04-24T00:00:00Z",
			"2031-09-05T00:00:00Z", "2031-10-24T00:00:00Z", "2031-10-30T00:00:00Z"}).Draw(t, "start"))
		var steps []grid.Interval
		end := start.Add(6 * unit.Day)
		for from := start.Add(-unit.Day); from < end.Add(unit.Day); {
			to := from.Add(bridgeSlot * unit.Duration(rapid.IntRange(1, 100).Draw(t, "step")))
			if rapid.IntRange(0, 15).Draw(t, "hole") == 0 {
				to = min(to, from.Add(6*bridgeSlot)) // may be too much, and may not
			} else {
				steps = append(steps, grid.Interval{From: from, To: to, I: unit.Intensity(rapid.IntRange(0, 800).Draw(t, "g"))})
			}
			from = to
		}
		if len(steps) == 0 {
			return
		}
		s := grid.NewSeries("NORTH", grid.Average, grid.Direct, steps)
		draw := func(label string) []compare.BridgeRun {
			from := start.Add(bridgeSlot * unit.Duration(rapid.IntRange(0, 6*96-1).Draw(t, label)))
			return bridgeRun(s, from, min(end, from.Add(bridgeSlot*unit.Duration(rapid.IntRange(1, 200).Draw(t, label+" length")))))
		}
		base, head := draw("base"), draw("head")
		b, h := compare.NewBridgeDays(base, head, loc)

		days := bridgeSlots(s, start.Add(-2*unit.Day), end.Add(2*unit.Day), loc)
		date := func(at unit.Instant) string { return at.Time().In(loc).Format(time.DateOnly) }
		first, last := date(min(base[0].From, head[0].From)), date(max(base[0].To, head[0].To)-1)
		z, ok := bridgeSlotMean(days, first, last)
		if !ok {
			assert.Nil(t, b)
			assert.Nil(t, h)
			return
		}
		a, _ := bridgeSlotMean(days, date(base[0].From), date(base[0].To-1))
		bridgeDaysAre(t, z, a, b, "base")
		a, _ = bridgeSlotMean(days, date(head[0].From), date(head[0].To-1))
		bridgeDaysAre(t, z, a, h, "head")
	})
}

// TestBridgeIntensity: Z, A and I of runs make the whole of a bridge's grid.
func TestBridgeIntensity(t *testing.T) {
	first := bridgeAt(t, "2031-03-01T00:00:00Z")
	north := bridgeSeries(first, unit.Hour*12, 100, 300, 500, 500)
	b, h := compare.NewBridgeDays(bridgeRun(north, first, first.Add(unit.Hour)), bridgeRun(north, first.Add(unit.Day), first.Add(25*unit.Hour)), time.UTC)
	base, head := bridgeSide(1, 10, 1.5, 0, 0, 100), bridgeSide(1, 10, 1.5, 0, 0, 500)
	base.Days, head.Days = b, h
	bridge := compare.NewBridge(compare.BridgeJob{Base: base, Head: head})
	// I from 100 to 500: the day went from 200 to 500, the hour from 1/2 to 1 of it.
	weight := (7500 - 1500) / 1.6094379124341003 // ln 5
	bridgeNear(t, 0, &bridge.Parts.Zone, "zone")
	bridgeNear(t, weight*0.9162907318741551, &bridge.Parts.Day, "day: ln 2.5")
	bridgeNear(t, weight*0.6931471805599453, &bridge.Parts.Hour, "hour: ln 2")
}

// BenchmarkBridgeDays: a year of five-minute steps, 400 runs over all of it.
func BenchmarkBridgeDays(b *testing.B) {
	first := bridgeAt(b, "2031-01-01T00:00:00Z")
	r := rand.New(rand.NewPCG(1, 2))
	values := make([]float64, 365*288)
	for n := range values {
		values[n] = 100 + 500*r.Float64()
	}
	s := bridgeSeries(first, 5*unit.Minute, values...)
	var runs []compare.BridgeRun
	for range 400 {
		from := first.Add(unit.Duration(r.Int64N(int64(364 * unit.Day))))
		runs = append(runs, bridgeRun(s, from, from.Add(4*unit.Hour))...)
	}
	for b.Loop() {
		if base, _ := compare.NewBridgeDays(runs[:200], runs[200:], time.UTC); base == nil {
			b.Fatal("the series knows every day")
		}
	}
}
