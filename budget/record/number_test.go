package record

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// TestBadNumbers: what no meter can have read is no reading, for every kind of
// line and key that carries a number.
func TestBadNumbers(t *testing.T) {
	lines := map[string]struct {
		line func(value string) string
		do   string
	}{
		"w":       {func(v string) string { return power(2, "gpu0", v) }, "write a power in W"},
		"j":       {func(v string) string { return energy(2, "cpu", v) }, "write a counter's reading in J"},
		"kwh":     {func(v string) string { return used(2, 3, v) }, "write an energy in kWh"},
		"done":    {func(v string) string { return work(2, "step", v) }, "write the work done so far"},
		"wrap_j":  {func(v string) string { return wrapping(2, "cpu", 1, v) }, "write the counter's range in J"},
		"planned": {func(v string) string { return strings.Replace(work(2, "step", 1), "}", `,"planned":`+v+"}", 1) }, "write the work planned"},
	}
	for key, l := range lines {
		refusesLine(t, l.line("-0.001"), fmt.Sprintf("%q is -0.001, below zero; %s, at least 0, and drop readings that the meter marks as bad", key, l.do))
		refusesLine(t, l.line("1e999"), fmt.Sprintf("%q is 1e999, which is beyond any finite number; %s", key, l.do))
		refusesLine(t, l.line("-1e999"), fmt.Sprintf("%q is -1e999, which is beyond any finite number; %s", key, l.do))
		refusesLine(t, l.line(`"400"`), fmt.Sprintf("%q is \"400\", not a number; %s", key, l.do))
		refusesLine(t, l.line("true"), fmt.Sprintf("%q is true, not a number; %s", key, l.do))
		refusesLine(t, l.line("[1]"), fmt.Sprintf("%q is [1], not a number; %s", key, l.do))
		refusesLine(t, l.line("NaN"), "the line is not valid JSON; write one whole JSON object a line")
		refusesLine(t, l.line("Infinity"), "the line is not valid JSON; write one whole JSON object a line")
		for _, odd := range []string{"-Infinity", "+1", "01", "1.", ".5", "0x10", "1_000", "1e", "--1"} {
			got := read(t, text(opening, l.line(odd)))
			assert.Len(t, got.findings, 1, "%s %s", key, odd)
		}
		if key != "wrap_j" && key != "planned" {
			refusesLine(t, l.line("null"), fmt.Sprintf("%q is missing; %s", key, l.do))
		}
		if key != "wrap_j" {
			got := read(t, text(opening, l.line("-0")))
			assert.Empty(t, got.findings, "-0 is 0")
		}
	}
	refusesLine(t, wrapping(2, "cpu", 1, 0), `"wrap_j" is 0; write the counter's range in J, or leave it out`)
}

// TestNumbersAreExact: at the ends of what a float holds and where rounding is
// hardest, by the fast path and by the general one.
func TestNumbersAreExact(t *testing.T) {
	for written, want := range map[string]float64{
		"0": 0, "0.0": 0, "-0": 0, "-0.0e0": 0, "5e-324": 5e-324, "1.7976931348623157e308": 1.7976931348623157e308, "1e-400": 0,
		"9007199254740993": 9007199254740992, "999999999999999": 999999999999999, "0.00000000000001": 1e-14, "0.1": 0.1, "412.5": 412.5,
		"123456.789012345": 123456.789012345, "1.00000000000000011102230246251565404236316680908203126": 1.0000000000000002, "4E2": 400,
	} {
		got := read(t, text(opening, power(1, "gpu0", written)))
		require.Empty(t, got.findings)
		assert.Equal(t, want, float64(got.lines[1].Power), written)
		assert.False(t, math.Signbit(float64(got.lines[1].Power)), written)
	}
}
