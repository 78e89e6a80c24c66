package footprint_test

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"gonum.org/v1/gonum/integrate"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// patient is a method that bridges any gap, so that a few samples make a run.
func patient() footprint.Method {
	m := method
	m.MaxGap = 48 * unit.Hour
	return m
}

// TestConstantPowerOnSinusoid: hourly values of 300 + 200 sin(2 pi k/24) under
// constant power of 1 kW. The sum of the first n sines has a closed form
// (Lagrange): sin(n x/2) sin((n-1) x/2) / sin(x/2).
func TestConstantPowerOnSinusoid(t *testing.T) {
	const x = 2 * math.Pi / 24
	values := make([]float64, 48)
	for k := range values {
		values[k] = 300 + 200*math.Sin(x*float64(k))
	}
	s := series(hour, values...)
	for _, n := range []float64{1, 7, 13, 24, 31} {
		r := open(t).power(0, "m", 1000).power(n*hour, "m", 1000).close(n*hour).run(plain(s), patient())
		want := 300*n + 200*math.Sin(n*x/2)*math.Sin((n-1)*x/2)/math.Sin(x/2)
		assert.InEpsilon(t, want, value(t, r.Operational), 1e-12, "%v h", n)
		assert.InEpsilon(t, want/n, value(t, r.Intensity), 1e-12)
	}
}

// TestRampAcrossSteps: power rises from 0 to P over n hours. Hour k takes the
// share ((k+1)^2 - k^2)/n^2 of P n/2, whatever the hours cost.
func TestRampAcrossSteps(t *testing.T) {
	const n, peak = 5, 2000.0
	values := []float64{100, 500, 50, 900, 10}
	var want float64
	for k, v := range values {
		want += v * float64(2*k+1) / (n * n) * peak / 1000 * n / 2
	}
	up := open(t).power(0, "m", 0).power(n*hour, "m", peak).close(n*hour).run(plain(series(hour, values...)), patient())
	assert.InEpsilon(t, want, value(t, up.Operational), 1e-13)
	assert.InEpsilon(t, peak/1000*n/2, value(t, up.Measured), 1e-14)

	// The same ramp downwards, over the same hours in the other order.
	down := open(t).power(0, "m", peak).power(n*hour, "m", 0).close(n*hour).run(plain(series(hour, 10, 900, 50, 500, 100)), patient())
	assert.InEpsilon(t, want, value(t, down.Operational), 1e-13)
}

// TestRampStartsWithinStep: neither the record nor the samples keep to the
// steps of the series. P = t W from 20 min to 80 min; 100 until 30 min, then
// 200 until 60 min, then 400 g/kWh.
func TestRampStartsWithinStep(t *testing.T) {
	r := open(t, opensAt(1200)).power(1200, "m", 1200).power(4800, "m", 4800).close(4800).
		run(plain(series(hour/2, 100, 200, 400, 400)), patient())
	square := func(a, b float64) float64 { return (b*b - a*a) / 2 / 3.6e6 }
	want := 100*square(1200, 1800) + 200*square(1800, 3600) + 400*square(3600, 4800)
	assert.InEpsilon(t, want, value(t, r.Operational), 1e-13)
}

// TestAgainstTrapezoid compares with gonum's trapezoidal rule on a dense grid:
// a power curve read every second on steps of 7 minutes. At a step the grid
// has its moment twice, with the intensity before and after.
func TestAgainstTrapezoid(t *testing.T) {
	const every, n = 420, 7200
	curve := func(at float64) float64 { return 900 + 400*math.Sin(at/97) + 150*math.Cos(at/7.3) }
	s := open(t)
	var values, x, watts, grams []float64
	for k := range n/every + 1 {
		values = append(values, 300+250*math.Sin(float64(k)))
	}
	for at := 0.0; at <= n; at++ {
		p, step := curve(at), int(at)/every
		s.power(at, "m", p)
		if int(at)%every == 0 && at > 0 {
			x, watts, grams = append(x, at), append(watts, p), append(grams, p*values[step-1])
		}
		x, watts, grams = append(x, at), append(watts, p), append(grams, p*values[step])
	}
	r := s.close(n).run(plain(series(every, values...)), method)
	assert.InEpsilon(t, integrate.Trapezoidal(x, watts)/3.6e6, value(t, r.Measured), 1e-12)
	assert.InEpsilon(t, integrate.Trapezoidal(x, grams)/3.6e6, value(t, r.Operational), 1e-12)
}

// TestFactorsOfTheChain: measured / share x PUE x intensity, each figure with
// its own link.
func TestFactorsOfTheChain(t *testing.T) {
	f := plain(flat(400))
	f.Machine.MeasuredShare, f.Site.PUE = 0.75, 1.18
	f.Site.Market = ptr(unit.Intensity(305))
	r := open(t).powers(0, hour, 60, "a", 900).powers(0, hour, 60, "b", 600).close(hour).run(f, method)
	assert.InEpsilon(t, 1.5, value(t, r.Measured), 1e-14)
	assert.InEpsilon(t, 2.0, value(t, r.MachineKWh), 1e-14)
	assert.InEpsilon(t, 2.36, value(t, r.Facility), 1e-14)
	assert.InEpsilon(t, 944, value(t, r.Operational), 1e-14)
	assert.InEpsilon(t, 2.36*305, value(t, r.Market), 1e-14)
	assert.InEpsilon(t, 400, value(t, r.Intensity), 1e-14)
	assert.InEpsilon(t, 944, value(t, r.Total), 1e-14, "market-based emissions are shown beside, not added")
	assert.Nil(t, r.Embodied)
}

// TestMetersSeeThreeQuarters: GPUs take about three quarters of a training
// server's electricity (common practice, no source): a third is to be added
// to what their meters count.
func TestMetersSeeThreeQuarters(t *testing.T) {
	s := open(t)
	for _, gpu := range []string{"gpu0", "gpu1", "gpu2", "gpu3"} {
		s.powers(0, hour, 60, gpu, 412.5)
	}
	f := plain(flat(400))
	f.Machine.MeasuredShare = 0.75
	r := s.close(hour).run(f, method)
	assert.InEpsilon(t, value(t, r.Measured)*4/3, value(t, r.MachineKWh), 1e-14)
	assert.InEpsilon(t, 2.2*400, value(t, r.Operational), 1e-14)
}
