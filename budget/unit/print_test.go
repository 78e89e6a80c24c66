package unit

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
)

func TestPrint(t *testing.T) {
	for _, c := range []struct {
		value interface{ String() string }
		want  string
	}{
		{Mass(25_000), "25.0 kg"},
		{Mass(1), "1.00 g"},
		{Mass(123_456), "123 kg"},
		{Mass(0.0042), "4.20 mg"},
		{Mass(7e12), "7.00 Mt"},
		{Mass(-1500), "-1.50 kg"},
		{Mass(0), "0 g"},
		{Mass(math.Copysign(0, -1)), "0 g"},
		{Mass(4.2e-10), "0.000420 µg"},
		{Mass(4.2e-13), "4.20e-07 µg"},
		{Mass(1.5e23), "1.50e+11 Mt"},
		{Energy(0.35), "350 Wh"},
		{Energy(1), "1.00 kWh"},
		{Energy(1e-3), "1.00 Wh"}, // sizes below one are not exact as floats
		{Energy(1e-6), "1.00 mWh"},
		{Energy(1234), "1.23 MWh"},
		{Energy(0), "0 kWh"},
		{Joules(262_144), "262000 J"},
		{Joules(0), "0 J"},
		{Power(2800), "2.80 kW"},
		{Power(0), "0 W"},
		{Intensity(412), "412 g/kWh"},
		{Intensity(1234), "1230 g/kWh"},
		{Intensity(0.5), "0.500 g/kWh"},
		{Share(0.05), "5.00 %"},
		{Share(0.57), "57.0 %"},
		{Share(-0.123456), "-12.3 %"},
		{Share(0), "0 %"},
		{72 * Hour, "3.00 d"},
		{90 * Minute, "1.50 h"},
		{90 * Second, "1.50 min"},
		{4 * Year, "4.00 y"},
		{Duration(1_500_000), "1.50 ms"},
		{Duration(0), "0 s"},
		{-2 * Hour, "-2.00 h"},
		{Work{100_000, "step"}, "100000 step"},
		{Work{0.5, "epoch"}, "0.500 epoch"},
		{Rate{1.2, 1000, "step"}, "1.20 g per 1000 step"},
		{Rate{0.003, 1, "token"}, "3.00 mg per token"},
		{Rate{3, 1e6, "token"}, "3.00 g per 1000000 token"},
	} {
		assert.Equal(t, c.want, c.value.String())
	}
}

// TestPrefixBoundary: the prefix is chosen after rounding, tried at the
// threshold and at its floating-point neighbours.
func TestPrefixBoundary(t *testing.T) {
	below := func(x float64) float64 { return math.Nextafter(x, 0) }
	above := func(x float64) float64 { return math.Nextafter(x, math.Inf(1)) }
	for _, c := range []struct {
		grams float64
		want  string
	}{
		{999.4, "999 g"},
		{below(999.5), "999 g"},
		{999.5, "1.00 kg"},
		{above(999.5), "1.00 kg"},
		{999.6, "1.00 kg"},
		{below(1000), "1.00 kg"},
		{1000, "1.00 kg"},
		{above(1000), "1.00 kg"},
		{below(999_500), "999 kg"},
		{999_500, "1.00 t"},
		{-999.6, "-1.00 kg"},
		{9.996, "10.0 g"},
		{99.96, "100 g"},
	} {
		assert.Equal(t, c.want, Mass(c.grams).String(), "%v", c.grams)
		assert.Equal(t, c.want, Mass(c.grams).Text(3))
	}
	assert.Equal(t, "1.0 kg", Mass(999.6).Text(2))
	assert.Equal(t, "999.6 g", Mass(999.6).Text(4))
}

// TestDurationBoundary: the steps of a duration are no powers of ten.
func TestDurationBoundary(t *testing.T) {
	for _, c := range []struct {
		d    Duration
		want string
	}{
		{59_940 * Second / 1000, "59.9 s"},
		{59_960 * Second / 1000, "1.00 min"},
		{Hour - Second, "1.00 h"},
		{23*Hour + 54*Minute, "23.9 h"},
		{23*Hour + 58*Minute, "1.00 d"},
		{Year, "1.00 y"},
		{364 * Day, "364 d"},
		{Year - 6*Hour, "1.00 y"},
		{100 * Second, "1.67 min"},
	} {
		assert.Equal(t, c.want, c.d.String())
	}
}

func TestApart(t *testing.T) {
	for _, c := range []struct {
		a, b         Mass
		wantA, wantB string
	}{
		{25_040, 25_000, "25.04 kg", "25.00 kg"},
		{25_000, 25_000, "25.0 kg", "25.0 kg"},
		{25_000, 40_000, "25.0 kg", "40.0 kg"},
		{0, 1e-9, "0 g", "0.00100 µg"},
		{-1, 1, "-1.00 g", "1.00 g"},
		{999.96, 1000, "999.96 g", "1.0000 kg"},
	} {
		a, b := Apart(c.a, c.b)
		assert.Equal(t, []string{c.wantA, c.wantB}, []string{a, b})
	}
	a, b := Apart(Rate{1.2, 1000, "step"}, Rate{1.2004, 1000, "step"})
	assert.Equal(t, []string{"1.2000 g per 1000 step", "1.2004 g per 1000 step"}, []string{a, b})
	c, d := Apart(72*Hour, 72*Hour+Second)
	assert.NotEqual(t, c, d)
}

func TestSigned(t *testing.T) {
	assert.Equal(t, "+1.20 kg", Signed(Mass(1200)))
	assert.Equal(t, "-1.20 kg", Signed(Mass(-1200)))
	assert.Equal(t, "0 g", Signed(Mass(0)))
	assert.Equal(t, "+8.00 %", Signed(Share(0.08)))
}

// TestPlusMinus: one prefix for both, that of the larger.
func TestPlusMinus(t *testing.T) {
	assert.Equal(t, "25.0 ± 2.5 kg", Mass(25_000).PlusMinus(2_500))
	assert.Equal(t, "1.00 ± 0.10 kg", Mass(999.6).PlusMinus(100))
	assert.Equal(t, "0 ± 120 g", Mass(0).PlusMinus(120))
	assert.Equal(t, "-1.20 ± 0.20 kg", Mass(-1200).PlusMinus(200))
	assert.Equal(t, "350 ± 20 Wh", Energy(0.35).PlusMinus(0.02))
}
