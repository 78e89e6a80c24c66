package unit

import (
	"math"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"
)

// written is one quantity as the properties see it: in base units.
type written struct {
	parse func(string) (float64, error)
	text  func(float64, int) string
	least float64 // smallest size it prints with, in base units
}

func quantity[T interface {
	~float64
	Texter
}](parse func(string) (T, error), least float64) written {
	return written{
		parse: func(s string) (float64, error) { v, err := parse(s); return float64(v), err },
		text:  func(v float64, digits int) string { return T(v).Text(digits) },
		least: least,
	}
}

var quantities = []written{
	quantity(ParseMass, 1e-6), quantity(ParseEnergy, 1e-9), quantity(ParsePower, 1e-6),
	quantity(ParseIntensity, 1), quantity(ParseShare, 0.01),
}

// positive draws values over all magnitudes that occur and some that do not.
func positive(t *rapid.T) float64 {
	mantissa := rapid.Float64Range(1, 10).Draw(t, "mantissa")
	return mantissa * math.Pow10(rapid.IntRange(-20, 20).Draw(t, "exponent"))
}

// TestPrintedParses: what is printed is a text that the parser takes, and
// within half a unit of the last figure of what was printed.
func TestPrintedParses(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		q := rapid.SampledFrom(quantities).Draw(t, "quantity")
		v, digits := positive(t), rapid.IntRange(1, 15).Draw(t, "digits")
		got, err := q.parse(q.text(v, digits))
		require.NoError(t, err)
		assert.InDelta(t, 0, got/v-1, 0.5001*math.Pow10(1-digits)+1e-15, q.text(v, digits))
	})
}

// TestExactPrintRoundTrips: at 17 figures nothing is lost.
func TestExactPrintRoundTrips(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		q, v := rapid.SampledFrom(quantities).Draw(t, "quantity"), positive(t)
		got, err := q.parse(q.text(v, 17))
		require.NoError(t, err)
		assert.Equal(t, v, got, q.text(v, 17))
	})
}

// TestThreeFigures: three figures stand before the unit, and from the smallest
// prefix up the number is at least 1 and, but for the largest, below 1000.
func TestThreeFigures(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := positive(t)
		if rapid.Bool().Draw(t, "near a boundary") {
			v = math.Pow10(rapid.IntRange(-6, 12).Draw(t, "power")) * rapid.SampledFrom([]float64{0.9995, 0.99949, 0.9996, 1}).Draw(t, "factor")
			v = math.Nextafter(v, rapid.SampledFrom([]float64{0, v, 1e99}).Draw(t, "side"))
		}
		for _, text := range []string{Mass(v).String(), Energy(v).String(), Power(v).String()} {
			number, symbol, _ := strings.Cut(text, " ")
			if strings.HasPrefix(symbol, "µ") || strings.HasPrefix(symbol, "T") || symbol == "Mt" || symbol == "GW" {
				continue // beyond the prefixes the number may have any size
			}
			assert.Len(t, strings.ReplaceAll(number, ".", ""), 3, text)
			assert.NotEqual(t, byte('0'), number[0], text)
		}
	})
}

func TestNegativePrintsLikePositive(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		q, v := rapid.SampledFrom(quantities).Draw(t, "quantity"), positive(t)
		assert.Equal(t, "-"+q.text(v, 3), q.text(-v, 3))
	})
}

// TestApartTellsApart: two values that differ never print alike, down to
// neighbouring floats; nobody should read "40.0 kg is over 40.0 kg".
func TestApartTellsApart(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := positive(t)
		w := v * (1 + math.Pow10(rapid.IntRange(-15, -1).Draw(t, "distance")))
		if rapid.Bool().Draw(t, "neighbour") {
			w = math.Nextafter(v, math.Inf(1))
		}
		for _, pair := range [][2]string{
			two(Apart(Mass(v), Mass(w))), two(Apart(Energy(v), Energy(w))), two(Apart(Power(v), Power(w))),
			two(Apart(Intensity(v), Intensity(w))), two(Apart(Share(v), Share(w))),
			two(Apart(Rate{Mass(v), 1000, "step"}, Rate{Mass(w), 1000, "step"})),
		} {
			assert.NotEqual(t, pair[0], pair[1])
		}
	})
}

func two(a, b string) [2]string { return [2]string{a, b} }

func TestDurationRoundTrips(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d := Duration(rapid.Int64Range(1, int64(290*Year)).Draw(t, "ns"))
		got, err := ParseDuration(d.Text(15))
		require.NoError(t, err)
		assert.InDelta(t, 0, float64(got)/float64(d)-1, 1e-9, d.Text(15))
	})
}

// TestRateRoundTrips: a rate that is printed stands for the same mass per unit.
func TestRateRoundTrips(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		r := Rate{Mass(positive(t)), float64(rapid.IntRange(1, 1e9).Draw(t, "per")), rapid.StringMatching(`[a-z]{1,9}`).Draw(t, "unit")}
		got, err := ParseRate(r.Text(17))
		require.NoError(t, err)
		assert.Equal(t, r, got)
	})
}
