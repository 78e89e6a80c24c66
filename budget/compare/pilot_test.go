package compare_test

import (
	"math"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/stat"
	"gonum.org/v1/gonum/stat/distuv"
	"pgregory.net/rapid"

	"budgetcheck/budget/compare"
	"budgetcheck/budget/unit"
)

// pilotOf is a pilot whose batches of 100 units take these energies after a
// start-up of 5 kWh, with the given number of work lines to a batch.
func pilotOf(planned float64, perBatch int, energies ...float64) compare.Pilot {
	p := compare.Pilot{Lines: []compare.PilotLine{{Energy: 5}}, Planned: planned, Measured: 5}
	for k, e := range energies {
		for n := range perBatch {
			share := float64(n+1) / float64(perBatch)
			p.Lines = append(p.Lines, compare.PilotLine{Done: 100 * (float64(k) + share), Energy: p.Measured + unit.Energy(e*share)})
		}
		p.Measured += unit.Energy(e)
	}
	return p
}

func pilotK() compare.Pilot { return pilotOf(4000, 2, 10, 11, 9, 10, 12, 10, 9, 9) }

func pilotProjected(t require.TestingT, p compare.Pilot) compare.Projection {
	out, doubt := p.Project()
	require.Empty(t, doubt)
	return out
}

// K: start-up 5 kWh, batches of 100 units 10 11 9 10 12 10 9 9 kWh, planned
// 4000: b 0.1, 405 kWh, half-width 36.26.
func TestPilot(t *testing.T) {
	out := pilotProjected(t, pilotK())
	assert.InEpsilon(t, 0.1, float64(out.PerUnit), 1e-12)
	assert.InEpsilon(t, 405, float64(out.Energy), 1e-12)
	assert.InDelta(t, 36.26, float64(out.HalfWidth), 0.005)
	assert.InEpsilon(t, float64(out.HalfWidth)/2.364624, float64(out.StdErr), 1e-6, "t(0.975, 7) from the tables")
	assert.InEpsilon(t, math.Pow(36.26/2.364624/405, 2), math.Pow(float64(out.StdErr/out.Energy), 2), 1e-3)
}

// TestPilotCorrelation: r = r1 + (1 + 4 max(r1, 0))/8, held in 0..0.8, for
// batches whose r1 is plain from the squares and products of their deviations.
func TestPilotCorrelation(t *testing.T) {
	for _, c := range []struct {
		deviations []float64
		squares, r float64
	}{
		{[]float64{0, 1, -1, 0, 2, 0, -1, -1}, 8, 0.125},          // r1 = 0
		{[]float64{-1, -1, 1, 1, 1, 1, -1, -1}, 8, 0.375 + 2.5/8}, // r1 = 3/8
		{[]float64{-2, -1, 1, 2, 2, 1, -1, -2}, 20, 0.8},          // r1 = 1/2 would make 0.875
		{[]float64{1, -1, 0, 2, 0, -2, 0, 0}, 10, -0.1 + 1./8},    // r1 = -1/10
		{[]float64{1, -1, 1, -1, 1, -1, 1, -1}, 8, 0},             // r1 = -7/8
	} {
		var energies []float64
		for _, d := range c.deviations {
			energies = append(energies, 10+d)
		}
		out := pilotProjected(t, pilotOf(4000, 2, energies...))
		want := 2.364624 * math.Sqrt(c.squares/7*(32+32*32/8.)*(1+c.r)/(1-c.r))
		assert.InEpsilon(t, want, float64(out.HalfWidth), 1e-6, "%v", c.deviations)
		assert.InEpsilon(t, 405, float64(out.Energy), 1e-12)
	}
}

// TestPilotUnproven: what a pilot must show, and the neighbour of each limit.
func TestPilotUnproven(t *testing.T) {
	lines := func(n int, planned float64) compare.Pilot { // even progress to 800 units
		p := compare.Pilot{Planned: planned, Measured: 85}
		for k := range n {
			share := float64(k) / float64(n-1)
			wiggle := 0.1 * math.Sin(float64(7*k)) // so that no batch is exactly like another
			p.Lines = append(p.Lines, compare.PilotLine{Done: 800 * share, Energy: unit.Energy(5 + 80*share + wiggle)})
		}
		return p
	}
	repeated := lines(15, 4000)
	repeated.Lines = append(repeated.Lines, repeated.Lines[14], repeated.Lines[14])
	apart := pilotOf(4000, 4, 10, 11, 9, 10, 12, 10, 9, 9)
	apart.Lines = append(apart.Lines[:8], apart.Lines[13:]...) // 175 to 325 units
	for _, c := range []struct {
		what  string
		pilot compare.Pilot
		doubt string
	}{
		{"16 lines", lines(16, 4000), ""},
		{"15 lines", lines(15, 4000), "a pilot needs 16 work lines with progress, it has 15"},
		{"15 lines, the last one three times", repeated, "a pilot needs 16 work lines with progress, it has 15"},
		{"no lines", compare.Pilot{Planned: 1}, "a pilot needs 16 work lines with progress, it has 0"},
		{"5 %", lines(20, 16000), ""},
		{"less", lines(20, math.Nextafter(16000, 17000)), "of the planned work, it did 0.0499"},
		{"half of that", lines(20, 32000), "a pilot must do 5.00 % of the planned work, it did 2.50 %"},
		{"one unit to go", lines(20, 801), ""},
		{"none", lines(20, 800), "nothing is left"},
		{"no plan", lines(20, 0), "nothing is left"},
		{"a step of more than a batch", apart, "too far apart"},
		{"a drift", pilotOf(4000, 2, 9, 9.4, 9.5, 10, 10.1, 10.4, 10.5, 11), "not settled"},
		{"a rising start", pilotOf(4000, 2, 5, 7, 8, 9, 9.5, 10, 10, 10), "not settled"},
		{"a falling one", pilotOf(4000, 2, 15, 14, 13, 12, 11, 10, 9, 8), "not settled"},
		{"no drift in noise", pilotOf(4000, 2, 9, 11, 9.5, 10, 12, 9.4, 10.5, 11), ""},
	} {
		out, doubt := c.pilot.Project()
		if c.doubt == "" {
			assert.Empty(t, doubt, c.what)
			continue
		}
		assert.Contains(t, doubt, c.doubt, c.what)
		assert.Zero(t, out, c.what)
	}
}

// TestPilotDrift: the slope of the batches against Student's t at 99 %, the
// slope and its error reckoned from their definitions.
func TestPilotDrift(t *testing.T) {
	critical := distuv.StudentsT{Mu: 0, Sigma: 1, Nu: 6}.Quantile(0.995)
	assert.InDelta(t, 3.707, critical, 0.0005, "from the tables")
	rapid.Check(t, func(t *rapid.T) {
		energies, order := make([]float64, 8), []float64{1, 2, 3, 4, 5, 6, 7, 8}
		trend := rapid.Float64Range(-1, 1).Draw(t, "trend")
		for k := range energies {
			energies[k] = 20 + trend*order[k] + rapid.Float64Range(-2, 2).Draw(t, "noise")
		}
		start, slope := stat.LinearRegression(order, energies, nil, false)
		var residual, spread float64
		for k, e := range energies {
			residual += math.Pow(e-start-slope*order[k], 2)
			spread += math.Pow(order[k]-4.5, 2)
		}
		ratio := math.Abs(slope) / math.Sqrt(residual/6/spread)
		_, doubt := pilotOf(4000, 2, energies...).Project()
		if math.Abs(ratio-critical) > 1e-6 {
			assert.Equal(t, ratio > critical, strings.HasPrefix(doubt, "not settled"), "t = %v", ratio)
		}
	})
}

// TestPilotStraightDrift: batches that lie on a line leave no residual at all,
// and rounding may take their correlation beyond 1.
func TestPilotStraightDrift(t *testing.T) {
	for n := 1; n <= 2000; n++ {
		var energies []float64
		for k := range 8 {
			energies = append(energies, 10+0.0005*float64(n*k))
		}
		_, doubt := pilotOf(4000, 2, energies...).Project()
		require.Contains(t, doubt, "not settled", "slope %v", 0.0005*float64(n))
	}
}

// TestPilotConstantLoad: what never varies is certain, and does not drift by
// the last digits of its cutting. Those of the first two do fall on a slope.
func TestPilotConstantLoad(t *testing.T) {
	constant := func(startUp, perUnit float64, lines int) {
		p := compare.Pilot{Planned: 10 * float64(lines)}
		for k := range lines {
			p.Lines = append(p.Lines, compare.PilotLine{Done: float64(k), Energy: unit.Energy(startUp + perUnit*float64(k))})
		}
		p.Measured = p.Lines[lines-1].Energy
		out := pilotProjected(t, p)
		require.InEpsilon(t, startUp+perUnit*p.Planned, float64(out.Energy), 1e-9)
		require.Less(t, float64(out.HalfWidth), 1e-6*float64(out.Energy))
	}
	constant(116.92, 50.316, 32)
	constant(360.38, 66.974, 40)
	for n := 1; n <= 500; n++ {
		constant(3, 0.001*float64(n), 16+n%50)
	}
}
