package shift

import (
	"math"
	"math/bits"
	"math/rand/v2"
	"slices"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// cases is how many random runs are held against all ways to shift them.
func cases() int {
	if testing.Short() {
		return 500
	}
	return 10_000
}

// drawn is a small run at a small series, and its samples, with which the tests
// integrate on their own.
type drawn struct {
	Run
	Place
	samples []Sample
}

// draw makes a run of some seconds. Moments are on whole seconds or anywhere,
// intensities few enough for ties or any, and some series have holes.
func draw(r *rand.Rand) (d drawn) {
	grain := []unit.Duration{unit.Second, unit.Second / 4, 1}[r.IntN(3)]
	within := func(d unit.Duration) unit.Duration { return unit.Duration(r.Int64N(int64(d/grain)+1)) * grain }
	duration := unit.Second + within(20*unit.Second)
	for range 1 + r.IntN(6) {
		d.samples = append(d.samples, Sample{within(duration), unit.Power(r.IntN(4) * 500)})
	}
	slices.SortFunc(d.samples, func(a, b Sample) int { return int(a.At - b.At) })
	d.Profile, _ = Linear(duration, d.samples)
	d.Start, d.Embodied, d.PUE = after(within(3*unit.Second)), unit.Mass(r.IntN(2))*1e-5, 1+r.Float64()
	d.Series = drawSeries(r, grain)
	return d
}

func drawSeries(r *rand.Rand, grain unit.Duration) *grid.Series {
	var steps []grid.Interval
	from := midnight.Add(-unit.Second)
	holes := []float64{0, 0.03}[r.IntN(2)]
	for range 8 + r.IntN(12) {
		to := from.Add(grain * unit.Duration(1+r.Int64N(int64(6*unit.Second/grain))))
		i := unit.Intensity(r.IntN(4) * 100)
		if r.IntN(4) == 0 {
			i += unit.Intensity(r.Float64())
		}
		if len(steps) == 0 || r.Float64() >= holes {
			steps = append(steps, grid.Interval{From: from, To: to, I: i})
		}
		from = to
	}
	return grid.NewSeries("NORTH", grid.Average, grid.Direct, steps)
}

// power at a moment, from the right or the left of it.
func (d drawn) power(at unit.Duration, right bool) float64 {
	n := 0 // samples at or before the moment
	for n < len(d.samples) && (d.samples[n].At < at || right && d.samples[n].At == at) {
		n++
	}
	if n == 0 || n == len(d.samples) {
		return float64(d.samples[max(n-1, 0)].W)
	}
	a, b := d.samples[n-1], d.samples[n]
	return float64(a.W) + float64(b.W-a.W)*float64(at-a.At)/float64(b.At-a.At)
}

// charge is the emissions of the power from one moment of the run's own time to
// another when the first is at start: trapezoids between all corners.
func (d drawn) charge(from, to unit.Duration, start unit.Instant) float64 {
	corners := []unit.Duration{from, to}
	for _, s := range d.samples {
		corners = append(corners, s.At)
	}
	for _, in := range d.Series.Steps() {
		corners = append(corners, from+in.From.Sub(start), from+in.To.Sub(start))
	}
	slices.Sort(corners)
	var g float64
	for n, b := range corners[1:] {
		a := corners[n]
		if a < from || b > to || a == b {
			continue
		}
		i, ok := d.Series.At(start.Add(a - from))
		if !ok {
			return math.Inf(1)
		}
		g += float64(i) * (d.power(a, true) + d.power(b, false)) / 2 * (b - a).Seconds() / 3.6e6
	}
	return g
}

func (d drawn) sum(g float64) float64 {
	return g*d.PUE + float64(d.Embodied)*d.Profile.Duration().Seconds()
}

// Against every start.
func TestDeferredStartIsLeast(t *testing.T) {
	r := rand.New(rand.NewPCG(8, 1))
	found, later := 0, 0
	for range cases() {
		d, window := draw(r), unit.Duration(r.IntN(40))*unit.Second+unit.Duration(r.IntN(2))
		var all []float64
		for s := range int(window/unit.Second) + 1 {
			all = append(all, d.sum(d.charge(0, d.Profile.Duration(), d.Start.Add(unit.Duration(s)*unit.Second))))
		}
		got, least := DeferredStart(d.Run, d.Place, window), slices.Min(all)
		if math.IsInf(least, 1) {
			require.Nil(t, got, "no start has a price")
			continue
		}
		require.NotNil(t, got)
		at := int(got.Start.Sub(d.Start) / unit.Second)
		first := slices.IndexFunc(all, func(g float64) bool { return g <= least*(1+tie)+1e-15 })
		require.InDelta(t, least, float64(got.Total), least*2*tie+1e-15)
		require.Equal(t, first, at, "of %v", all)
		require.InDelta(t, all[at], float64(got.Total), 1e-13)
		if found++; at > 0 {
			later++
		}
	}
	assert.Greater(t, found, cases()/2)
	assert.Greater(t, later, cases()/4)
}

// Against all sets of slots.
func TestInterruptedRunIsLeast(t *testing.T) {
	r := rand.New(rand.NewPCG(8, 2))
	found, paused := 0, 0
	for range cases() {
		d := draw(r)
		how := Pausing{Slot: d.Profile.Duration()/unit.Duration(1+r.IntN(5)) + 1, Stretch: 1 + 1.5*r.Float64(), Resume: unit.Energy(r.IntN(3)) * 2e-4}
		how.MinSlice = unit.Duration(r.IntN(4)) * how.Slot / 2
		least := d.leastOfAll(how)
		got := interrupted(t, d.Run, d.Place, how)
		if math.IsInf(least, 1) {
			require.Nil(t, got, "no set of slots has a price")
			continue
		}
		require.NotNil(t, got)
		require.InDelta(t, least, float64(got.Total), least*tie+1e-14)
		if found++; got.Resumes > 0 {
			paused++
		}
	}
	assert.Greater(t, found, cases()/2)
	assert.Greater(t, paused, cases()/20)
}

func (d drawn) leastOfAll(how Pausing) float64 {
	n := int(math.Ceil(float64(d.Profile.Duration()) / float64(how.Slot)))
	m := max(n, int(how.Stretch*float64(d.Profile.Duration())/float64(how.Slot)))
	least := math.Inf(1)
	for set := range uint(1) << m {
		if bits.OnesCount(set) == n && sliced(set, how) {
			least = min(least, d.sum(d.chargeSet(set, how)))
		}
	}
	return least
}

// sliced tells whether all slices but the last are long enough.
func sliced(set uint, how Pausing) bool {
	for set >>= bits.TrailingZeros(set); set != 0; set >>= bits.TrailingZeros(set) {
		ones := bits.TrailingZeros(^set)
		if set >>= ones; set != 0 && unit.Duration(ones)*how.Slot < how.MinSlice {
			return false
		}
	}
	return true
}

func (d drawn) chargeSet(set uint, how Pausing) (g float64) {
	done := unit.Duration(0)
	for i := 0; set>>i != 0; i++ {
		if set>>i&1 == 0 {
			continue
		}
		start := d.Start.Add(unit.Duration(i) * how.Slot)
		to := min(done+how.Slot, d.Profile.Duration())
		g += d.charge(done, to, start)
		if done > 0 && set>>(i-1)&1 == 0 && how.Resume > 0 {
			g += float64(how.Resume) * d.meanOf(start, to-done)
		}
		done = to
	}
	return g
}

// meanOf is the mean intensity over a time.
func (d drawn) meanOf(start unit.Instant, length unit.Duration) (mean float64) {
	level := drawn{Place: d.Place, samples: []Sample{{0, 1000}}}
	return level.charge(0, length, start) / (length.Seconds() / 3600)
}
