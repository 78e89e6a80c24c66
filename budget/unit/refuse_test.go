package unit

import (
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/stretchr/testify/assert"
)

// parsers are all parsers that read a number, by the example that each gives
// in its messages.
var parsers = map[string]func(string) error{
	"25 kg":               fails(ParseMass),
	"350 Wh":              fails(ParseEnergy),
	"2.8 kW":              fails(ParsePower),
	"412 g/kWh":           fails(ParseIntensity),
	"5 %":                 fails(ParseShare),
	"72h":                 fails(ParseDuration),
	"100000 step":         fails(ParseWork),
	"1.2 g per 1000 step": fails(ParseRate),
}

func fails[T any](parse func(string) (T, error)) func(string) error {
	return func(text string) error {
		_, err := parse(text)
		return err
	}
}

// TestRefused: no number that is not a plain, finite, non-negative one is
// taken by any parser, and the message shows what was written.
func TestRefused(t *testing.T) {
	for _, number := range []string{"-1", "+1", "NaN", "nan", "Inf", "inf", "-inf", "Infinity", "0x10", "0b1", "1_000", "1,000", "1.000,5",
		"1 000", "1.2.3", "--1", "1/2", "½", "٣", "kg", ".", "e5", "1e999", "1e", "1e+"} {
		for example, parse := range parsers {
			text := number + " " + strings.TrimLeft(example, "0123456789. ")
			if err := parse(text); assert.Error(t, err, text) {
				assert.Contains(t, err.Error(), `"`+text+`"`, "the message quotes what was written")
			}
		}
	}
}

func TestRefusedEverywhere(t *testing.T) {
	for _, text := range []string{"", " ", "\t\n", "%%", "per", " per ", "\x00", "1 \xff", "-", "1 kg 2 kg", "1 g per ", "1 g per 5", "1 g per 0 step",
		"0 step", "1 two words", "1 g per two words", "1 g per 5 two words", "1 g per -5", "1 g per +5 step", "1 g per 1,000 step", "1 g per 1,000step",
		"1,000step", "1 -step", "step"} {
		for example, parse := range parsers {
			assert.Error(t, parse(text), "%q like %q", text, example)
		}
	}
}

func TestMessages(t *testing.T) {
	for _, c := range []struct{ example, text, want string }{
		{"25 kg", "25", `"25" is not a mass of CO2e: it has no unit; use one of µg, mg, g, kg, t, kt, Mt, like "25 kg"`},
		{"25 kg", "25 stone", `"25 stone" is not a mass of CO2e: unknown unit "stone"; use one of µg, mg, g, kg, t, kt, Mt, like "25 kg"`},
		{"25 kg", "25 KG", `"25 KG" is not a mass of CO2e: unknown unit "KG"; use one of µg, mg, g, kg, t, kt, Mt, like "25 kg"`},
		{"25 kg", "", `"" is not a mass of CO2e: no number at the start; write it like "25 kg"`},
		{"25 kg", "-25 kg", `"-25 kg" is not a mass of CO2e: it is below zero; write it like "25 kg"`},
		{"25 kg", "1,000 kg", `"1,000 kg" is not a mass of CO2e: a comma stands in the number; write it like "25 kg"`},
		{"25 kg", "1e999 kg", `"1e999 kg" is not a mass of CO2e: the number is too large; write it like "25 kg"`},
		{"25 kg", "1e308 Mt", `"1e308 Mt" is not a mass of CO2e: the number is too large; write it like "25 kg"`},
		{"350 Wh", "7 W", `"7 W" is not an energy: unknown unit "W"; use one of µWh, mWh, Wh, kWh, MWh, GWh, TWh, like "350 Wh"`},
		{"5 %", "5 percent", `"5 percent" is not a share: unknown unit "percent"; use one of %, like "5 %"`},
		{"72h", "5", `"5" is not a duration: it has no unit; use one of ms, s, min, h, d, y, like "72h"`},
		{"72h", "1h30", `"1h30": "30" is not a duration: it has no unit; use one of ms, s, min, h, d, y, like "72h"`},
		{"72h", "-5m", `"-5m" is not a duration: it is below zero; write it like "72h"`},
		{"72h", "293y", `"293y" is not a duration: longer than 292 years; write it like "72h"`},
		{"1.2 g per 1000 step", "1.2 g", `"1.2 g" is not a rate; write it like "1.2 g per 1000 step"`},
		{"1.2 g per 1000 step", "1.2 per step", `"1.2 per step" is not a rate: "1.2" is not a mass of CO2e: it has no unit; use one of µg, mg, g, kg, t, kt, Mt, like "25 kg"`},
		{"100000 step", "many step", `"many step" is not an amount of work; write a number above zero and one word, like "100000 step"`},
	} {
		assert.EqualError(t, parsers[c.example](c.text), c.want)
	}
}

// TestLongNumber: a number of a million digits is refused, not computed with.
func TestLongNumber(t *testing.T) {
	_, err := ParseMass("1." + strings.Repeat("0", 1_000_001) + " g")
	assert.ErrorContains(t, err, "the number is too long")
}

// TestOtherGases: only CO2 equivalents are taken; the warming potential of
// another gas would have to be guessed, and a gas in a wrong place is no unit.
func TestOtherGases(t *testing.T) {
	for _, text := range []string{"25 kg CO2", "25 kg CH4", "25 kg CO2e CO2e", "25 CO2e", "25 CO2e kg", "CO2e 25 kg", "CO2e"} {
		assert.Error(t, parsers["25 kg"](text), text)
	}
	assert.Error(t, parsers["412 g/kWh"]("412 g CO2/kWh"))
	assert.Error(t, parsers["412 g/kWh"]("412 CO2e g/kWh"))
}

// TestLongInputIsClipped: a message stays readable whatever was written, and
// is cut between characters.
func TestLongInputIsClipped(t *testing.T) {
	for example, parse := range parsers {
		err := parse("1-" + strings.Repeat("µ", 1e5))
		if assert.Error(t, err, example) {
			assert.Less(t, len(err.Error()), 500, example)
			assert.True(t, utf8.ValidString(err.Error()), example)
			assert.NotContains(t, err.Error(), `\x`, example)
		}
	}
}
