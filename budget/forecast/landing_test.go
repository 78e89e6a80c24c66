package forecast

import (
	"math"
	"slices"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/unit"
)

// devore are ten observations, of which the prediction interval of one more at
// 95 % is 12.09 to 31.71 (Devore, Probability and Statistics, 7.3; from memory).
var devore = []float64{25.2, 21.3, 22.8, 17.0, 29.8, 21.0, 25.5, 16.0, 20.9, 19.5}

// past are nightly runs of an hour, the last one in the night before now, at
// intensity i and with embodied emissions m.
func past(now unit.Instant, i unit.Intensity, m unit.Mass, kwh ...float64) (runs []Run) {
	for n, e := range kwh {
		start := now.Add(-unit.Duration(len(kwh)-n) * unit.Day).Add(2*unit.Hour + 15*unit.Minute)
		runs = append(runs, Run{start, start.Add(unit.Hour), unit.Energy(e), m, i.Of(unit.Energy(e)) + m})
	}
	return runs
}

// nights are m firings, the first in the night after now.
func nights(t require.TestingT, now unit.Instant, m int) []unit.Instant {
	return nightly(t, now, now.Add(unit.Duration(m)*unit.Day))
}

// of is the landing of jobs with nothing spent, in a March of which n days are gone.
func of(t require.TestingT, n int, jobs ...Job) Budget[unit.Mass] {
	p := march(t)
	return Budget[unit.Mass]{Period: p, Now: p.From.Add(unit.Duration(n) * unit.Day), Limit: 1e12, Jobs: jobs}
}

// steady is a job on a grid that never changes.
func steady(t require.TestingT, now unit.Instant, i float64, left int, kwh ...float64) Job {
	return Job{Name: "tide", Zone: "NORTH", Series: flat(i, 365, now), Past: past(now, unit.Intensity(i), 0, kwh...), Left: nights(t, now, left)}
}

// TestPredictionIntervals: on a steady grid only the runs differ. One run left is
// Devore's; 15 runs left are 15 x 21.9 +- t(0.975, 9) s sqrt(15 + 225/10), which
// is 271.23 to 385.77. The same of energy, and where the series is too short.
func TestPredictionIntervals(t *testing.T) {
	for m, want := range map[int][2]float64{1: {12.09, 31.71}, 15: {271.23, 385.77}} {
		b := of(t, 10)
		b.Jobs = []Job{steady(t, b.Now, 1, m, devore...)}
		got := LandMass(b)
		assert.InDelta(t, want[0], float64(*got.Low), 0.005)
		assert.InDelta(t, want[1], float64(*got.High), 0.005)
		assert.InDelta(t, 21.9*float64(m), float64(*got.Expected), 1e-9)
		assert.InDelta(t, 9, got.DF, 1e-9)
		assert.Equal(t, float64(m), got.RunsLeft)
		assert.InDelta(t, 0, *got.Terms[0].Miss, 1e-12)
		assert.Empty(t, got.Notes)

		energy := LandEnergy(Budget[unit.Energy]{Period: b.Period, Now: b.Now, Limit: 1e12, Jobs: b.Jobs})
		assert.InDelta(t, want[0], float64(*energy.Low), 0.005)
		assert.InDelta(t, want[1], float64(*energy.High), 0.005)
		assert.Empty(t, energy.Notes)

		b.Jobs[0].Series = flat(1, 12, b.Now) // these ten are not correlated from night to night
		short := LandMass(b)
		assert.InDelta(t, want[0], float64(*short.Low), 0.005)
		assert.InDelta(t, want[1], float64(*short.High), 0.005)
		assert.Equal(t, []string{"NORTH: grid known from 12 nights only"}, short.Notes)
		assert.Nil(t, short.Terms[0].Miss)
	}
}

// alternating are n values of mean and sample standard deviation as given, n even.
func alternating(n int, mean, sd float64) []float64 {
	x := make([]float64, n)
	for i := range x {
		x[i] = mean + sd*math.Sqrt(float64(n-1)/float64(n))*float64(1-i%2*2)
	}
	return x
}

// TestThreeTerms: E 10 kWh, s_E 0.5, I 400, e 0.2, m 15, n 30 is 60 kg with a
// standard uncertainty of sqrt(12^2 + 0.2^2 (15 + 225/30)) = 12.037 kg. With a
// ratio of 5 +- 2 % the runs take more, and 10 x 400 x 15 x 0.02 g joins.
func TestThreeTerms(t *testing.T) {
	b := of(t, 10)
	j := steady(t, b.Now, 400, 15, alternating(30, 10, 0.5)...)
	priced := func() *estimate {
		e := j.estimate(b.Period, b.Now)
		o, ok := e.outlook(asOf(j.Series, b.Now))
		require.True(t, ok)
		o.miss = 0.2
		e.priced(o)
		return e
	}
	e := priced()
	all := combined(shares([]*estimate{e}))
	assert.InEpsilon(t, 60_000, e.expected, 1e-12)
	assert.InDelta(t, 12_037, all.u, 0.5)
	// By Welch-Satterthwaite, of floor((365 - 28)/15) = 22 and 29.
	assert.InEpsilon(t, math.Pow(all.u, 4)/(math.Pow(12_000, 4)/22+math.Pow(400*0.5, 4)*22.5*22.5/29), all.df, 1e-9)

	j.Ratio, j.RatioU, j.RatioDF = 0.05, 0.02, 11
	e = priced()
	assert.InEpsilon(t, 63_000, e.expected, 1e-12)
	assert.InEpsilon(t, 12_600, e.weather.u, 1e-9)
	assert.InEpsilon(t, 400*0.525*math.Sqrt(22.5), e.noise.u, 1e-9)
	assert.InEpsilon(t, 1_200, e.ratio.u, 1e-9)
	assert.Equal(t, 11.0, e.ratio.df)
}

// TestEmbodied is added for each run as it was, whatever the ratio.
func TestEmbodied(t *testing.T) {
	b := of(t, 10)
	for _, days := range []int{365, 10} { // by the grid, and by past totals
		j := Job{Name: "tide", Series: flat(400, days, b.Now), Past: past(b.Now, 400, 57, 10, 10, 10, 10), Left: nights(t, b.Now, 3), Ratio: 0.1}
		b.Jobs, b.Spent = []Job{j}, 1000
		assert.InEpsilon(t, 1000+3*(4400+57), float64(*LandMass(b).Expected), 1e-12)
	}
}

// TestOneWeather: two jobs in one zone have one weather, which adds; in two zones
// it joins in quadrature, like everything else.
func TestOneWeather(t *testing.T) {
	b := of(t, 10)
	values := make([]float64, 400)
	for n := range values {
		values[n] = 400 + 100*math.Sin(float64(n*n))
	}
	j := Job{Name: "tide", Zone: "NORTH", Series: series(b.Now.Add(-400*unit.Day), unit.Day, values...),
		Past: past(b.Now, 400, 0, alternating(30, 10, 0.5)...), Left: nights(t, b.Now, 15)}
	other := j
	other.Zone = "SOUTH"
	b.Jobs = []Job{j, j}
	one := LandMass(b)
	weather, noise := float64(one.Terms[0].Weather), float64(one.Terms[0].Noise)
	require.True(t, weather > 100 && noise > 100)
	assert.InEpsilon(t, math.Sqrt(4*weather*weather+2*noise*noise), float64(one.U), 1e-12)
	b.Jobs = []Job{j, other}
	two := LandMass(b)
	assert.InEpsilon(t, math.Sqrt(2*weather*weather+2*noise*noise), float64(two.U), 1e-12)
	assert.Equal(t, *one.Expected, *two.Expected)
	assert.Equal(t, 30.0, two.RunsLeft)
	assert.InEpsilon(t, float64(*two.Expected), float64(two.Terms[0].Expected+two.Terms[1].Expected), 1e-12)
}

// TestRunsOut: 4 kg a night at 02:15. The limit is passed when the sum is above
// it; exactly at the limit is within.
func TestRunsOut(t *testing.T) {
	b := of(t, 10)
	b.Jobs = []Job{steady(t, b.Now, 400, 21, 10, 10, 10)}
	b.Spent = 38_000
	for limit, day := range map[unit.Mass]string{38_000: "11", 42_000: "12", 41_999: "11", 60_000: "16", 121_999: "31"} {
		b.Limit = limit
		on := LandMass(b).RunsOutOn
		require.NotNil(t, on, limit)
		assert.Equal(t, "2031-03-"+day+"T02:15:00Z", on.String(), limit)
	}
	b.Limit = 122_000
	assert.Nil(t, LandMass(b).RunsOutOn, "exactly at the limit")
	b.Limit = 37_999
	assert.Equal(t, b.Now, *LandMass(b).RunsOutOn, "passed before")
	b.Limit, b.Jobs[0].Left[0] = 38_000, b.Now.Add(-unit.Hour)
	assert.Equal(t, b.Now, *LandMass(b).RunsOutOn, "by a run that is late")
}

// TestBurn: 10 of 31 days gone and half of the limit spent is 1.55 times the
// pace of time.
func TestBurn(t *testing.T) {
	b := of(t, 10)
	b.Spent, b.Limit = 20_000, 40_000
	assert.InEpsilon(t, 1.55, *LandMass(b).BurnRatio, 1e-12)
	b.Now = b.Period.To.Add(unit.Day)
	assert.InEpsilon(t, 0.5, *LandMass(b).BurnRatio, 1e-12, "after its end")
	for _, now := range []unit.Instant{b.Period.From, b.Period.From - 1} {
		b.Now = now
		assert.Nil(t, LandMass(b).BurnRatio, "before its time")
	}
	b = of(t, 10)
	b.Limit = 0
	assert.Nil(t, LandMass(b).BurnRatio, "without a limit")
}

// TestNothingKnown: a job without past runs is not zero emissions.
func TestNothingKnown(t *testing.T) {
	b := of(t, 10)
	known, unknown := steady(t, b.Now, 400, 3, 10, 10, 10), steady(t, b.Now, 400, 3)
	unknown.Name = "eval"
	b.Jobs, b.Spent, b.Limit = []Job{known, unknown}, 1000, 9000
	l := LandMass(b)
	assert.Nil(t, l.Expected)
	assert.Nil(t, l.Low)
	assert.Equal(t, []string{"eval has no past run to land its next ones by"}, l.Notes)
	assert.Equal(t, "2031-03-13T02:15:00Z", l.RunsOutOn.String(), "by the known job alone")

	unknown.Past = known.Past[:1]
	b.Jobs[1] = unknown
	l = LandMass(b)
	assert.InEpsilon(t, 1000+6*4000, float64(*l.Expected), 1e-12)
	assert.Nil(t, l.High)
	assert.Equal(t, []string{"eval has one past run only, which shows no spread"}, l.Notes)
}

// TestNothingLeft: what is spent is certain.
func TestNothingLeft(t *testing.T) {
	b := of(t, 31, Job{Name: "tide"}, Job{Name: "eval", Rate: &Rate{0, 28 * unit.Day}})
	b.Spent = 5000
	l := LandMass(b)
	assert.Equal(t, []unit.Mass{5000, 5000, 5000}, []unit.Mass{*l.Low, *l.Expected, *l.High})
	assert.True(t, math.IsInf(l.DF, 1))
	assert.Empty(t, l.Notes)
}

// TestOnlyTheLastThirty past runs count.
func TestOnlyTheLastThirty(t *testing.T) {
	b := of(t, 10)
	b.Jobs = []Job{steady(t, b.Now, 400, 3, append(slices.Repeat([]float64{1000}, 20), slices.Repeat([]float64{10}, 30)...)...)}
	assert.InEpsilon(t, 12_000, float64(*LandMass(b).Expected), 1e-12)
}

// TestNextPeriod: of a period that has not begun, everything is to come.
func TestNextPeriod(t *testing.T) {
	b := of(t, 10)
	now := b.Now
	b.Jobs = []Job{steady(t, now, 400, 0, 10, 10, 10)}
	next, err := b.Period.Next(zone(t, "UTC"))
	require.NoError(t, err)
	b.Period, b.Jobs[0].Left = next, nightly(t, next.From, next.To)
	l := LandMass(b)
	assert.Equal(t, 30.0, l.RunsLeft)
	assert.InEpsilon(t, 30*4000, float64(*l.Expected), 1e-12)
	assert.Nil(t, l.BurnRatio)
	assert.Empty(t, l.Notes)

	b.Jobs[0].Left, b.Jobs[0].Rate = nil, &Rate{14, 28 * unit.Day}
	l = LandMass(b)
	assert.InEpsilon(t, 15, l.RunsLeft, 1e-12)
	assert.InEpsilon(t, 15*4000, float64(*l.Expected), 1e-12)
}
