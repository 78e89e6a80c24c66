package unit

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// parsed is the value of a text in base units.
func parsed[T ~float64](t *testing.T, parse func(string) (T, error), text string) float64 {
	t.Helper()
	v, err := parse(text)
	require.NoError(t, err)
	return float64(v)
}

// TestDefinitions: SI Brochure; NIST SP 811, Appendix B. All exact.
func TestDefinitions(t *testing.T) {
	assert.Equal(t, Energy(1), Joules(3_600_000).Energy(), "1 kWh = 3,600,000 J")
	assert.Equal(t, 1.0, parsed(t, ParseEnergy, "3600000 J"))
	assert.Equal(t, 453.59237, parsed(t, ParseMass, "1 lb"), "1 lb = 0.45359237 kg")
	assert.Equal(t, 907_184.74, parsed(t, ParseMass, "1 short ton"), "1 short ton = 907.18474 kg")
	assert.Equal(t, parsed(t, ParseMass, "4000 lb"), parsed(t, ParseMass, "2 short tons"), "a short ton is 2000 lb")
	assert.Equal(t, Energy(1), Power(1000).Over(Hour))
	assert.Equal(t, Mass(600), Intensity(300).Of(2))
}

// TestYear: ISO/IEC 21031:2024 counts a lifetime of 4 years as 4 x 365 days:
// 1000 kg reserved for 1 h is 6250/219 g. Years of 365.25 days would give 28.5193.
func TestYear(t *testing.T) {
	life, err := ParseDuration("4 years")
	require.NoError(t, err)
	assert.Equal(t, 4*365*Day, life)
	share := Hour.Seconds() / life.Seconds()
	assert.InEpsilon(t, 6250.0/219, parsed(t, ParseMass, "1000 kg")*share, 1e-15)
}

// TestEGRID: US EPA eGRID average CO2 output rates (read in transcriptions):
// 2022 823.1 lb/MWh, 2021 852.3 lb/MWh; the values in g/kWh are computed.
func TestEGRID(t *testing.T) {
	assert.InEpsilon(t, 373.351879747, parsed(t, ParseIntensity, "823.1 lb/MWh"), 1e-12)
	assert.InEpsilon(t, 386.596776951, parsed(t, ParseIntensity, "852.3 lb/MWh"), 1e-12)
	assert.Equal(t, parsed(t, ParseIntensity, "0.8231 lb/kWh"), parsed(t, ParseIntensity, "823.1 lb/MWh"))
}

// TestDelivered: US EPA equivalencies price a delivered kWh as 852.3 lb/MWh
// (eGRID2021) over 1 - 7.3 % line loss, with 2204.6 lb to the tonne: 4.17045e-4 t.
func TestDelivered(t *testing.T) {
	generated := parsed(t, ParseIntensity, "852.3 lb/MWh")
	assert.InEpsilon(t, parsed(t, ParseMass, "4.17045e-4 t"), generated/(1-0.073), 2e-5)
}

// TestRates: quotients of the SCI for AI draft, 9.1 and 9.2. Three unit labels
// in the draft are off by 1000; the quotients are what counts here.
func TestRates(t *testing.T) {
	for _, c := range []struct {
		mass   string
		amount float64
		unit   string
		per    float64
		want   float64 // g for every per
	}{
		{"6500 kg", 50e9, "token", 1, 1.3e-4},
		{"200000 kg", 5e22, "FLOP", 1, 4e-15},
		{"3200 kg", 40e6, "inference", 1, 0.08},
		{"75000 kg", 2.5e9, "parameter", 1e9, 30_000e3},
	} {
		r := RateOf(Mass(parsed(t, ParseMass, c.mass)), Work{c.amount, c.unit}, c.per)
		assert.InEpsilon(t, c.want, float64(r.Mass), 1e-15, c.unit)
		assert.InEpsilon(t, c.want/c.per, float64(r.PerUnit()), 1e-15, c.unit)
	}
	written, err := ParseRate("130 µg per token")
	require.NoError(t, err)
	assert.Equal(t, "130 µg per token", RateOf(6_500_000, Work{50e9, "token"}, 1).String())
	assert.InEpsilon(t, 1.3e-4, float64(written.PerUnit()), 1e-15)
}
