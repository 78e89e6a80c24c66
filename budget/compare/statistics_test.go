package compare

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"gonum.org/v1/gonum/stat"
)

// Tables of NIST/SEMATECH e-Handbook 1.3.6.7.2 (from memory), 1.3.5.3, and of
// JCGM 100:2008, H.1.6 and table G.2 (99 % on both sides).
func TestStudent(t *testing.T) {
	for _, c := range []struct{ p, df, want, figures float64 }{
		{0.95, 2, 2.920, 5e-4}, {0.95, 9, 1.833, 5e-4}, {0.975, 9, 2.262, 5e-4}, {0.99, 9, 2.821, 5e-4}, {0.95, 1, 6.314, 5e-4},
		{0.975, 326, 1.9673, 5e-5}, {0.995, 16, 2.92, 5e-3},
	} {
		assert.InDelta(t, c.want, student(c.p, c.df), c.figures, "%v", c)
	}
}

// norris is NIST StRD Norris: y, x, certified to all the digits below.
var norris = [][2]float64{{0.1, 0.2}, {338.8, 337.4}, {118.1, 118.2}, {888.0, 884.6}, {9.2, 10.1}, {228.1, 226.5}, {668.5, 666.3},
	{998.5, 996.3}, {449.1, 448.6}, {778.9, 777.0}, {559.2, 558.2}, {0.3, 0.4}, {0.1, 0.6}, {778.1, 775.5}, {668.8, 666.9},
	{339.3, 338.0}, {448.9, 447.5}, {10.8, 11.6}, {557.7, 556.0}, {228.3, 228.1}, {998.0, 995.8}, {888.8, 887.6}, {119.6, 120.2},
	{0.3, 0.3}, {0.6, 0.3}, {557.6, 556.8}, {339.3, 339.1}, {888.0, 887.2}, {998.5, 999.0}, {778.9, 779.0}, {10.2, 11.1},
	{117.6, 118.3}, {228.9, 229.2}, {668.4, 669.1}, {449.2, 448.9}, {0.2, 0.5}}

func fitted(yx [][2]float64) line {
	var x, y []float64
	for _, p := range yx {
		x, y = append(x, p[1]), append(y, p[0])
	}
	return leastSquares(x, y)
}

func TestNorris(t *testing.T) {
	l := fitted(norris)
	assert.InEpsilon(t, -0.262323073774029, l.intercept, 1e-10)
	assert.InEpsilon(t, 1.00211681802045, l.slope, 1e-12)
	assert.InEpsilon(t, 0.884796396144373, l.sd, 1e-11)
	assert.InEpsilon(t, 0.232818234301152, math.Sqrt(l.variance(0, l.sd)), 1e-10)
	assert.InEpsilon(t, 0.000429796848199937, l.sd/math.Sqrt(l.spread), 1e-11, "of the slope")
	assert.Equal(t, 34.0, l.df())
}

// TestThermometer: JCGM 100:2008, H.3: a line in t - 20, foretold at t = 30.
// Data from memory; R 4.2.2 on them gives every printed figure.
func TestThermometer(t *testing.T) {
	l := fitted([][2]float64{{-0.171, 1.521}, {-0.169, 2.012}, {-0.166, 2.512}, {-0.159, 3.003}, {-0.164, 3.507}, {-0.165, 3.999},
		{-0.156, 4.513}, {-0.157, 5.002}, {-0.159, 5.503}, {-0.161, 6.010}, {-0.160, 6.511}})
	assert.InDelta(t, -0.1712, l.intercept, 5e-5)
	assert.InDelta(t, 0.00218, l.slope, 5e-6)
	assert.InDelta(t, 0.0035, l.sd, 5e-5)
	assert.InDelta(t, 0.0029, math.Sqrt(l.variance(0, l.sd)), 5e-5)
	assert.InDelta(t, -0.1494, l.at(10), 5e-5)
	assert.InDelta(t, 0.0041, math.Sqrt(l.variance(10, l.sd)), 5e-5)
}

// cars is the data set of R: stopping distance, speed (Ezekiel 1930).
var cars = [][2]float64{{2, 4}, {10, 4}, {4, 7}, {22, 7}, {16, 8}, {10, 9}, {18, 10}, {26, 10}, {34, 10}, {17, 11}, {28, 11}, {14, 12},
	{20, 12}, {24, 12}, {28, 12}, {26, 13}, {34, 13}, {34, 13}, {46, 13}, {26, 14}, {36, 14}, {60, 14}, {80, 14}, {20, 15}, {26, 15},
	{54, 15}, {32, 16}, {40, 16}, {32, 17}, {40, 17}, {50, 17}, {42, 18}, {56, 18}, {76, 18}, {84, 18}, {36, 19}, {46, 19}, {68, 19},
	{32, 20}, {48, 20}, {52, 20}, {56, 20}, {64, 20}, {66, 22}, {54, 23}, {70, 24}, {92, 24}, {93, 24}, {120, 24}, {85, 25}}

// TestCars: prediction intervals for one more car, 95 % on both sides, by R
// 4.2.2: predict(lm(dist ~ speed, cars), interval = "prediction").
func TestCars(t *testing.T) {
	l := fitted(cars)
	for _, c := range []struct{ speed, fit, low, high float64 }{
		{10, 21.74499270073, -9.80960078798059, 53.2995861894405},
		{21, 65.0014890510949, 33.4225736404645, 96.5804044617253},
	} {
		stand := level{mean: l.at(c.speed), variance: l.variance(c.speed, l.sd), sd: l.sd, df: l.df()}
		half := estimated(stand, 0, stand.sd, 1).halfWidth(0.975)
		assert.InEpsilon(t, c.fit, stand.mean, 1e-11)
		assert.InEpsilon(t, c.low, stand.mean-half, 1e-10)
		assert.InEpsilon(t, c.high, stand.mean+half, 1e-11)
	}
}

// TestTwoSamples: NIST/SEMATECH e-Handbook 1.3.5.3, AUTO83B with unequal
// variances; figures by R 4.2.2.
func TestTwoSamples(t *testing.T) {
	american := level{mean: 20.14458, variance: square(6.41470) / 249, sd: 6.41470, df: 248}
	e := estimated(american, 30.48101, 6.10771, 79)
	assert.InDelta(t, 12.946, e.x/e.se, 5e-4)
	assert.InEpsilon(t, 12.9462675658764, e.x/e.se, 1e-6, "from rounded means and deviations")
	assert.InEpsilon(t, 136.874990093694, e.df, 1e-6)
}

// TestUnivariate: NIST StRD NumAcc1 to NumAcc4, certified. Their values take
// turns, so that none resembles the one before.
func TestUnivariate(t *testing.T) {
	turns := func(first, a, b float64) []float64 {
		x := []float64{first}
		for range 500 {
			x = append(x, a, b)
		}
		return x
	}
	for _, c := range []struct {
		x        []float64
		mean, sd float64
	}{
		{[]float64{10000001, 10000003, 10000002}, 10000002, 1},
		{turns(1.2, 1.1, 1.3), 1.2, 0.1},
		{turns(1000000.2, 1000000.1, 1000000.3), 1000000.2, 0.1},
		{turns(10000000.2, 10000000.1, 10000000.3), 10000000.2, 0.1},
	} {
		l := meanLevel(c.x)
		assert.InEpsilon(t, c.mean, l.mean, 1e-14)
		assert.InEpsilon(t, c.sd, l.sd, 1e-7)
		assert.InEpsilon(t, c.sd/math.Sqrt(float64(len(c.x))), math.Sqrt(l.variance), 1e-7)
		assert.Equal(t, float64(len(c.x)-1), l.df)
	}
}

// TestOutliers: Seo 2006, A Review and Comparison of Methods for Detecting
// Outliers in Univariate Data Sets (from memory, scores computed): median 4,
// median deviation 0.3, scores of 14 and 15 are 22.48 and 24.73. Their plain
// z-scores stay below 3: they widen the deviation that they are measured by.
func TestOutliers(t *testing.T) {
	x := []float64{3.2, 3.4, 3.7, 3.7, 3.8, 3.9, 4, 4, 4.1, 4.2, 4.7, 4.8, 14, 15}
	assert.Equal(t, []int{12, 13}, outliers(x))
	assert.Equal(t, 4.0, median(x))
	assert.InDelta(t, 0.3, median(distances(x, 4)), 1e-12)
	mean, sd := stat.MeanStdDev(x, nil)
	assert.Less(t, (15-mean)/sd, 3.0)

	edge := 4 + farthest*0.3/normalMAD // of the two far ones, one only just
	x[12] = math.Nextafter(edge, 0) - 1e-12
	assert.Equal(t, []int{13}, outliers(x))
	x[12] = edge + 1e-12
	assert.Equal(t, []int{12, 13}, outliers(x))
}

// Runs that agree to the last digit make no outlier of one that is a little
// off, only of one that is far off: 3.5 times the least noise.
func TestOutliersAmongEqualRuns(t *testing.T) {
	assert.Nil(t, outliers([]float64{1, 1, 1, 1.017}))
	assert.Equal(t, []int{1}, outliers([]float64{1, 1.018, 1, 1}))
	assert.Equal(t, []int{0}, outliers([]float64{0.982, 1, 1, 1}))
	assert.Nil(t, outliers(nil))
	assert.Nil(t, outliers([]float64{7}))
}
