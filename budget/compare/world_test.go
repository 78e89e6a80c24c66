package compare_test

import (
	"math"
	"math/rand/v2"

	"budgetcheck/budget/compare"
	"budgetcheck/budget/unit"
)

const (
	nights   = 10 // base runs of a job
	looks    = 6  // head runs of a job at most: the first and five more
	length   = 4  // hours a run takes
	daily    = 24 // hours
	daysIn   = 3 * 365
	lastsFor = 0.98 // autocorrelation of the weather from hour to hour
)

// world draws runs on a grid whose intensity swings threefold over the day, and
// about as much again with weather that lasts for days.
type world struct {
	*rand.Rand
	intensity []float64 // by hour, g/kWh
}

func newWorld(seed uint64) *world {
	w := &world{Rand: rand.New(rand.NewPCG(seed, 14))}
	weather, swing := 0.0, math.Log(3)/2
	for hour := range daysIn * daily {
		weather = lastsFor*weather + math.Sqrt(1-lastsFor*lastsFor)*w.NormFloat64()
		sun := math.Sin(2 * math.Pi * (float64(hour) - 3.5) / daily) // the nightly runs are at its middle
		w.intensity = append(w.intensity, 300*math.Exp(swing*(sun+weather/2)))
	}
	return w
}

// run draws a run that starts in the given hour and takes, but for its noise,
// so many times the energy of the base.
func (w *world) run(hour int, times, noise float64) compare.Sample {
	intensity := 0.0
	for _, i := range w.intensity[hour : hour+length] {
		intensity += i / length
	}
	return sample(40*times*math.Exp(noise*w.NormFloat64()), 1.2, intensity, 0)
}

// job is what there is to judge one job by: the runs of ten nights, and those
// of the head at any time of the day after.
type job struct{ base, head []compare.Sample }

func (w *world) job(times, noise float64) (j job) {
	day := w.IntN(daysIn - nights - 2)
	for n := range nights {
		j.base = append(j.base, w.run((day+n)*daily+2, 1, noise))
	}
	for range looks {
		j.head = append(j.head, w.run((day+nights)*daily+w.IntN(daily), times, noise))
	}
	return j
}

// plainly is the gate without any of this: the mean of the head's totals, as
// charged, against the base's.
func (j job) plainly(m int, maxRise unit.Share) compare.State {
	if charged(j.head[:m]) > charged(j.base)*(1+float64(maxRise)) {
		return compare.Over
	}
	return compare.Within
}

func charged(runs []compare.Sample) float64 {
	sum := 0.0
	for _, r := range runs {
		sum += float64(r.Operational)
	}
	return sum / float64(len(runs))
}
