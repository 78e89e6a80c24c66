package unit

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// same checks that every writing means the same value, to the last bit: what
// is exactly at a limit is within it, whichever prefix the limit is written in.
func same[T comparable](t *testing.T, parse func(string) (T, error), want T, writings ...string) {
	t.Helper()
	for _, text := range writings {
		got, err := parse(text)
		require.NoError(t, err, text)
		assert.Equal(t, want, got, text)
	}
}

func TestParseMass(t *testing.T) {
	same(t, ParseMass, Mass(25_000), "25 kg", "25kg", " 25  kg ", "25.0 kg", "25. kg", "2.5e1 kg", "2.5E+1 kg", "0.025 t",
		"25000 g", "25 kg CO2e", "25 kgCO2e", "25 kg CO2eq", "25 kg CO2-eq", "025 kg", "25\u00a0kg")
	same(t, ParseMass, Mass(1_200_000), "1.2 t", "1200 kg", "1.2e-6 Mt", "0.0012 kt")
	same(t, ParseMass, Mass(0.003), "3 mg", "3000 µg", "3000 ug", ".003 g")
	same(t, ParseMass, Mass(0), "0 kg", "0.000 t", "1e-400 g", "0e999999999 g", "1e-999999999 g")
	same(t, ParseMass, Mass(1005), "1.005 kg", "1005 g", "0.001005 t", "1005000 mg")
}

func TestParseEnergy(t *testing.T) {
	same(t, ParseEnergy, Energy(0.35), "350 Wh", "350Wh", "0.35 kWh", "0.00035 MWh", "350000 mWh", "350e6 µWh", "350e6 uWh")
	same(t, ParseEnergy, Energy(2), "7.2 MJ", "7200 kJ", "7200000 J", "0.0072 GJ")
	same(t, ParseEnergy, Energy(1.2e6), "1.2 GWh", "0.0012 TWh", "1200 MWh")
}

func TestParsePower(t *testing.T) {
	same(t, ParsePower, Power(2800), "2.8 kW", "2800 W", "2800W", "0.0028 MW", "2.8e-6 GW", "2800000 mW")
	same(t, ParsePower, Power(412.5), "412.5 W", "412500000 µW", "412500000 uW")
}

func TestParseIntensity(t *testing.T) {
	same(t, ParseIntensity, Intensity(412), "412 g/kWh", "0.412 kg/kWh", "412 kg/MWh", "0.412 t/MWh", "412 t/GWh",
		"412 gCO2e/kWh", "412 g CO2eq/kWh", "412 g/kWh CO2e", "412000 g/MWh", "412000 mg/kWh", "412 mg/Wh")
	same(t, ParseIntensity, Intensity(400), "0.4 kg/kWh")
}

func TestParseShare(t *testing.T) {
	same(t, ParseShare, Share(0.05), "5%", "5 %", "0.05", "5e-2", ".05")
	same(t, ParseShare, Share(0.57), "57%", "0.57") // 57 x 0.01 is a neighbour of 0.57
	same(t, ParseShare, Share(1), "100 %", "1", "1.0")
}

func TestParseDuration(t *testing.T) {
	same(t, ParseDuration, 4*Year, "4y", "4 y", "4 years", "1460 d", "35040h")
	same(t, ParseDuration, 90*Minute, "1h30m", "1h 30min", " 1.5 h ", "90m", "90 min", "5400s", "5400 sec", "60m30m")
	same(t, ParseDuration, 72*Hour, "72h", "3d", "3 days")
	same(t, ParseDuration, 7*Day, "1w", "7 days", "168h")
	same(t, ParseDuration, 250*Second/1000, "250ms", "0.25s")
	same(t, ParseDuration, Duration(0), "0s", "0 h")
	same(t, ParseDuration, Day+Second, "1 day 1s", "86401s")
}

func TestParseRate(t *testing.T) {
	same(t, ParseRate, Rate{1.2, 1000, "step"}, "1.2 g per 1000 step", "1200 mg per 1e3 step", "1.2 g CO2e per 1000step", "1.2g  per  1000  step")
	same(t, ParseRate, Rate{0.003, 1, "token"}, "3 mg per token", "3 mg per 1 token")
	same(t, ParseRate, Rate{5, 2, "epoch"}, "5 g per 2 epoch")
	same(t, ParseRate, Rate{5, 1, "epoch"}, "5 g per epoch") // the unit may start like an exponent
}

func TestParseWork(t *testing.T) {
	same(t, ParseWork, Work{100_000, "step"}, "100000 step", "1e5 step", "100000step", " 100000  step ")
	same(t, ParseWork, Work{0.5, "epoch"}, "0.5 epoch", ".5 epoch")
}

// Set stands behind policy values and flags; a refused text must leave the
// value as it was.
func TestSet(t *testing.T) {
	m, e, p, i, s := Mass(1), Energy(1), Power(1), Intensity(1), Share(1)
	d, w, r := Second, Work{1, "step"}, Rate{1, 1, "step"}
	setters := []struct {
		set  func(string) error
		text string
		got  func() any
		want any
	}{
		{m.Set, "2 kg", func() any { return m }, Mass(2000)},
		{e.Set, "2 MWh", func() any { return e }, Energy(2000)},
		{p.Set, "2 kW", func() any { return p }, Power(2000)},
		{i.Set, "2 kg/kWh", func() any { return i }, Intensity(2000)},
		{s.Set, "2 %", func() any { return s }, Share(0.02)},
		{d.Set, "2m", func() any { return d }, 2 * Minute},
		{w.Set, "2 token", func() any { return w }, Work{2, "token"}},
		{r.Set, "2 g per token", func() any { return r }, Rate{2, 1, "token"}},
	}
	for _, c := range setters {
		require.NoError(t, c.set(c.text))
		assert.Equal(t, c.want, c.got())
		require.Error(t, c.set("two of them"))
		assert.Equal(t, c.want, c.got(), "after a refusal")
	}
}
