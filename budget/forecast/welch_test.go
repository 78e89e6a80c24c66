package forecast

import (
	"math"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/assert"
	"gonum.org/v1/gonum/stat"
	"gonum.org/v1/gonum/stat/distuv"
)

// TestEndGauge: JCGM 100:2008, H.1: 25 nm (18 degrees of freedom), 9.7 (25.6),
// 2.9 (50) and 16.6 (2) combine to 32 nm with 16, for which t at 99 % is 2.92.
func TestEndGauge(t *testing.T) {
	got := combined([]share{{25, 18}, {9.7, 25.6}, {2.9, 50}, {16.6, 2}})
	assert.InDelta(t, 32, got.u, 0.5)
	assert.Equal(t, 16.0, math.Floor(got.df), "%v", got.df)
	assert.InDelta(t, 2.92, distuv.StudentsT{Sigma: 1, Nu: math.Floor(got.df)}.Quantile(0.995), 0.005)
}

// TestCombined: one share keeps its degrees of freedom, one that is known exactly
// costs none, and nothing uncertain has no interval.
func TestCombined(t *testing.T) {
	assert.Equal(t, share{3, 7}, combined([]share{{3, 7}, {0, 1}, {}}))
	exact := combined([]share{{3, math.Inf(1)}, {4, math.Inf(1)}})
	assert.Equal(t, 5.0, exact.u)
	assert.InDelta(t, 5*1.959964, exact.half(), 1e-5, "the normal quantile")
	assert.InDelta(t, 5*12.7062, share{5, 1}.half(), 1e-3, "t(0.975, 1)")
	assert.Zero(t, combined([]share{{}, {}}).half())
}

// TestEffective: 30 values with lag-1 autocorrelation 0.5 say as much as 10
// (Zwiers & von Storch 1995: n(1-r)/(1+r)).
func TestEffective(t *testing.T) {
	assert.InEpsilon(t, 10, effective(30, 0.5, 2), 1e-15)
	assert.Equal(t, 30.0, effective(30, 0, 2))
	assert.Equal(t, 2.0, effective(30, 0.99, 2))
	assert.Equal(t, 1.0, effective(2, 0.8, 1))
	assert.Equal(t, 0.4, effective(0.4, 0.2, 1), "less than one is left")
}

// TestPersistenceByHand: of 1 2 3 4 5 about 3: (2+0+0+2)/10 = 0.4, and 2.6/5 for
// its bias, held at 0.8.
func TestPersistenceByHand(t *testing.T) {
	assert.Equal(t, 0.8, persistence([]float64{1, 2, 3, 4, 5}))
	assert.Zero(t, persistence([]float64{1, 2, 3, 4}), "four are too few")
	assert.Zero(t, persistence(devore), "they alternate")
	assert.Zero(t, persistence([]float64{2, 2, 2, 2, 2}))
}

// TestPersistenceOfWeather: of 30 nights with autocorrelation 0.6 the plain
// estimate says 0.5 or less in the mean; ours is within 0.05 of the truth.
func TestPersistenceOfWeather(t *testing.T) {
	r := rand.New(rand.NewPCG(31, 3))
	plain, ours := make([]float64, 2000), make([]float64, 2000)
	for n := range ours {
		x := weather(r, 30, 0.6)
		ours[n] = persistence(x)
		plain[n] = stat.Correlation(x[1:], x[:29], nil)
	}
	t.Logf("lag-1 autocorrelation 0.6 from 30 values: plain %.3f, ours %.3f", stat.Mean(plain, nil), stat.Mean(ours, nil))
	assert.Less(t, stat.Mean(plain, nil), 0.52)
	assert.InDelta(t, 0.6, stat.Mean(ours, nil), 0.05)
}
