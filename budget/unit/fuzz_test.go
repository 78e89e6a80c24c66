package unit

import (
	"math"
	"testing"
	"time"
	"unicode/utf8"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// readable checks a refusal: short, printable and quoting what was written.
func readable(t *testing.T, err error) {
	assert.Less(t, len(err.Error()), 1000)
	assert.True(t, utf8.ValidString(err.Error()))
	for _, r := range err.Error() {
		assert.True(t, r >= ' ' && r != 0x7f, "control character in %q", err.Error())
	}
}

func seed(f *testing.F, texts ...string) {
	for _, text := range texts {
		f.Add(text)
	}
}

func FuzzParseQuantity(f *testing.F) {
	seed(f, "25 kg", "25kg CO2e", "1.2 t", "350 Wh", "7.2 MJ", "412 g/kWh", "823.1 lb/MWh", "5%", "0.05", "2.8 kW", "1e999 kg", "0e99999999 g",
		"1e-320 mg", "2.5e+1 g", "-1 g", "NaN g", "0x1p4 g", "1,000 kg", "µg", "١ kg", "5. g", ".5 g", "1e308 Mt", "1 kg\xff")
	f.Fuzz(func(t *testing.T, text string) {
		for _, q := range quantities {
			v, err := q.parse(text)
			if err != nil {
				readable(t, err)
				continue
			}
			require.True(t, v >= 0 && !math.IsInf(v, 0), "%v", v)
			back, err := q.parse(q.text(v, 17))
			require.NoError(t, err)
			assert.Equal(t, v, back)
		}
	})
}

func FuzzParseRate(f *testing.F) {
	seed(f, "1.2 g per 1000 step", "3 mg per token", "3 mg CO2e per 1e9 parameter", "1 g per 0 step", "1 g per -5", "1 g per per", "1 g per 5e5e")
	f.Fuzz(func(t *testing.T, text string) {
		r, err := ParseRate(text)
		if err != nil {
			readable(t, err)
			return
		}
		require.True(t, r.Mass >= 0 && r.Per > 0 && r.Unit != "", "%v", r)
		require.False(t, math.IsInf(r.Per, 0) || math.IsInf(float64(r.Mass), 0), "%v", r)
		back, err := ParseRate(r.Text(17))
		require.NoError(t, err)
		assert.Equal(t, r, back)
	})
}

func FuzzParseDuration(f *testing.F) {
	seed(f, "4y", "1h30m", "72h", "2m", "250ms", "292y", "293y", "1h 30", "-5m", "9223372036.854775807s", "1e999s", "1h1h", "", "h")
	f.Fuzz(func(t *testing.T, text string) {
		d, err := ParseDuration(text)
		if err != nil {
			readable(t, err)
			return
		}
		require.GreaterOrEqual(t, d, Duration(0))
		back, err := ParseDuration(d.Text(15))
		if d < 290*Year { // beyond, the printed one may round up past the range
			require.NoError(t, err)
			assert.InDelta(t, d.Seconds(), back.Seconds(), d.Seconds()*1e-14+1e-9)
		}
	})
}

// FuzzParseInstant holds the parser against the standard library: whatever is
// taken is the same moment there, and is written in the letters of RFC 3339.
func FuzzParseInstant(f *testing.F) {
	seed(f, "2031-03-04T02:15:00Z", "2031-03-04T03:15:00.25+01:00", "2031-03-04T2:15:00Z", "2031-03-04T02:15:00,5Z", "1677-09-21T00:12:43.145224192Z",
		"2262-04-11T23:47:16.854775808Z", "2031-03-04T02:15:00+24:00", "2032-02-29T00:00:00-00:00", "2031-03-04T02:15:00.0123456789Z")
	f.Fuzz(func(t *testing.T, text string) {
		at, err := ParseInstant(text)
		if err != nil {
			readable(t, err)
			return
		}
		assert.Regexp(t, `^\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d(\.\d+)?(Z|[+-]\d\d:\d\d)$`, text)
		want, err := time.Parse(time.RFC3339Nano, text)
		require.NoError(t, err)
		assert.True(t, at.Time().Equal(want), text)
		back, err := ParseInstant(at.String())
		require.NoError(t, err)
		assert.Equal(t, at, back)
	})
}
