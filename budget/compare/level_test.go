package compare

import (
	"math"
	"slices"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"
)

// TestDriftByHand: four runs on a line of slope b, off it by a, -a, -a, a: that
// pattern has no mean and no slope of its own. Their residual deviation is
// sqrt(4 a^2 / 2); the next place, 4, is 2.5 from the mean one, and the squared
// distances add up to 5. A prediction there has the variance
// 2 a^2 (1 + 1/4 + 2.5^2/5) = 5 a^2.
func TestDriftByHand(t *testing.T) {
	const a, b = 0.01, 0.1
	l := levelOf(drifting(a, b))
	assert.True(t, l.drift)
	assert.InDelta(t, 4*b, l.mean, 1e-12, "where the line will be at the next run")
	assert.InEpsilon(t, a*math.Sqrt2, l.sd, 1e-9)
	assert.Equal(t, 2.0, l.df)
	assert.Nil(t, l.correlation)
	e := estimated(l, 4*b, l.sd, 1)
	assert.InDelta(t, 2.919986*a*math.Sqrt(5), e.halfWidth(0.95), 1e-8)
}

func drifting(a, b float64) []float64 { return []float64{a, b - a, 2*b - a, 3*b + a} }

// TestDriftBeginsAt99Percent: with the same four runs the slope's t is
// b sqrt(5)/(a sqrt(2)), and 99 % on both sides with 2 degrees of freedom is
// 9.924843.
func TestDriftBeginsAt99Percent(t *testing.T) {
	const a = 0.01
	edge := 9.924843 * a * math.Sqrt2 / math.Sqrt(5)
	for _, way := range []float64{1, -1} {
		assert.False(t, levelOf(drifting(a, way*edge*0.9999)).drift)
		assert.True(t, levelOf(drifting(a, way*edge*1.0001)).drift)
	}
}

// Runs that are alike to the last digits neither drift nor are certain.
func TestLeastNoise(t *testing.T) {
	for _, x := range [][]float64{{2, 2, 2}, {2, 2 + 1e-9, 2 + 2e-9, 2 + 3e-9, 2 + 4e-9}, {0.001, 0.002, 0.003}} {
		l := levelOf(x)
		assert.False(t, l.drift)
		assert.Equal(t, leastNoise, l.sd)
	}
	steep := levelOf([]float64{0, 1, 2, 3})
	assert.True(t, steep.drift)
	assert.Equal(t, leastNoise, steep.sd, "also off a line")
}

// TestCorrelationByHand: eight runs at a a -a -a a a -a -a. Neighbours' products
// add up to a^2 of the 8 a^2 of their squares: r = 1/8, n_eff = 8 (7/8)/(9/8) =
// 56/9, and the variance is 8 a^2/(8 - 8/n_eff) = 8 a^2/(47/7).
func TestCorrelationByHand(t *testing.T) {
	const a = 0.03
	l := levelOf([]float64{a, a, -a, -a, a, a, -a, -a})
	require.NotNil(t, l.correlation)
	assert.InEpsilon(t, 1/8.0, *l.correlation, 1e-12)
	assert.InEpsilon(t, 47/9.0, l.df, 1e-12)
	assert.InEpsilon(t, a*math.Sqrt(56/47.0), l.sd, 1e-12)
	assert.InEpsilon(t, a*math.Sqrt(56/47.0/(56/9.0)), math.Sqrt(l.variance), 1e-12)
}

// The last digits of runs that are alike make no pattern.
func TestRoundingIsNoPattern(t *testing.T) {
	const a = 1e-12
	l := levelOf([]float64{1, 1, 1 + a, 1 + a, 1, 1, 1, 1})
	assert.Less(t, *l.correlation, 1e-9)
	assert.InEpsilon(t, 7, l.df, 1e-6)
}

// Runs that take turns count as they are: a negative correlation would make
// them say more than their number.
func TestNoCredit(t *testing.T) {
	l := levelOf([]float64{0.1, -0.1, 0.1, -0.1, 0.1, -0.1})
	assert.Equal(t, 0.0, *l.correlation)
	assert.Equal(t, 5.0, l.df)
	assert.InEpsilon(t, 0.1*math.Sqrt(6/5.0), l.sd, 1e-12)
}

// A slow wave counts as two runs, however many there are.
func TestAtLeastTwo(t *testing.T) {
	var x []float64
	for k := range 40 {
		x = append(x, math.Cos(2*math.Pi*(float64(k)+0.5)/40)) // even about its middle: no slope
	}
	l := levelOf(x)
	require.False(t, l.drift)
	assert.Greater(t, *l.correlation, 0.9)
	assert.Equal(t, 1.0, l.df)
	assert.InEpsilon(t, l.sd*l.sd/2, l.variance, 1e-12)
}

// Four runs are too few to tell how they hang together.
func TestFewRunsAreIndependent(t *testing.T) {
	l := levelOf([]float64{1, 1, 0, 0})
	assert.Nil(t, l.correlation)
	assert.Equal(t, 3.0, l.df)
}

// drawn are the logarithms of some runs.
func drawn(t *rapid.T, name string, least, most int) []float64 {
	return rapid.SliceOfN(rapid.Float64Range(-0.2, 0.2), least, most).Draw(t, name)
}

// Where a level stands moves with its runs; how well it is known does not.
func TestLevelMoves(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x, by := drawn(t, "x", 3, 12), rapid.Float64Range(-10, 10).Draw(t, "by")
		was := levelOf(x)
		moved := slices.Clone(x)
		for k := range moved {
			moved[k] += by
		}
		is := levelOf(moved)
		assert.InDelta(t, was.mean+by, is.mean, 1e-9)
		assert.InDelta(t, math.Sqrt(was.variance), math.Sqrt(is.variance), 1e-9)
		assert.InDelta(t, was.sd, is.sd, 1e-9)
		assert.InEpsilon(t, was.df, is.df, 1e-6)
	})
}

// The base never counts as more runs than it has, nor as quieter than they are.
func TestCorrelationOnlyWidens(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x := drawn(t, "x", 3, 12)
		l, n := meanLevel(x), float64(len(x))
		assert.GreaterOrEqual(t, l.sd, leastNoise)
		assert.LessOrEqual(t, l.df, n-1)
		assert.GreaterOrEqual(t, l.variance, l.sd*l.sd/n*(1-1e-12))
	})
}
