package report

import (
	"bytes"
	"encoding/json"
	"fmt"
	"math"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// Programs get exact numbers: what is read back is what was written.
func TestFloatsRoundTrip(t *testing.T) {
	s := noRule.judge(t)
	values := []float64{0.1 + 0.2, 1.0 / 3, math.Nextafter(2200, 3000), 5e-324, math.MaxFloat64, 1e21, 1e-7, 0}
	for _, v := range values {
		m := unit.Mass(v)
		s.Runs[0].Total, s.Runs[0].Rate = &m, &v
		var back budget.Statement
		require.NoError(t, json.Unmarshal(asJSON(t, s), &back))
		require.Equal(t, math.Float64bits(v), math.Float64bits(float64(*back.Runs[0].Total)))
		require.Equal(t, math.Float64bits(v), math.Float64bits(*back.Runs[0].Rate))
	}
}

// A number that is none has no writing in JSON. It must stop the statement
// rather than stand in it as zero or null.
func TestNoNumberIsRefused(t *testing.T) {
	for _, v := range []float64{math.NaN(), math.Inf(1)} {
		s := noRule.judge(t)
		s.Runs[0].Rate = &v
		var b bytes.Buffer
		require.Error(t, JSON(&b, s))
		require.Zero(t, b.Len(), "and nothing half is written")
	}
}

func TestAbsentIsNotZero(t *testing.T) {
	r := &footprint.Run{Run: "a", Attempt: 1, Job: "b", Outcome: "ok", Factor: "average", Boundary: "direct", Parts: []footprint.RunPart{{Outcome: "ok"}}}
	var b bytes.Buffer
	require.NoError(t, RunsJSON(&b, []*footprint.Run{r}))
	for _, key := range []string{"total_g", "operational_g", "embodied_g", "measured_kwh", "coverage", "rate_g_per_unit", "market_g", "expanded_g"} {
		require.NotContains(t, b.String(), key)
	}
}

// The whole text is kept for programs, and is inert in a log that a CI system
// reads.
func TestHostileTextIsWholeInJSON(t *testing.T) {
	for n, text := range hostile() {
		t.Run(fmt.Sprint(n), func(t *testing.T) {
			s := filled(t, text)
			out := asJSON(t, s)
			var back budget.Statement
			require.NoError(t, json.Unmarshal(out, &back))
			require.Equal(t, string([]rune(text)), back.Branch, "%.60q", text)
			require.NotContains(t, string(out), "##")
			for _, line := range strings.Split(string(out), "\n") {
				require.NotRegexp(t, `^\s*::`, line)
			}
		})
	}
}

func TestKeysCarryUnits(t *testing.T) {
	out := string(asJSON(t, closed.judge(t)))
	for _, key := range []string{"total_g", "limit_g", "carried_g", "facility_kwh", "intensity_g_per_kwh", "rate_g_per_unit", "held_ratio", "change_g"} {
		require.Contains(t, out, `"`+key+`"`)
	}
	require.NotRegexp(t, `"(start|end|now)": "[^"]*[^Z"]"`, out, "times are UTC")
}
