package report

import (
	"encoding/xml"
	"fmt"
	"io"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
)

// read parses JUnit XML into the types that wrote it, and walks all of it, for
// a decoder stops where its value ends.
func read(t *testing.T, s *budget.Statement) (suites, string) {
	t.Helper()
	var b strings.Builder
	require.NoError(t, JUnit(&b, s))
	var out suites
	require.NoError(t, xml.Unmarshal([]byte(b.String()), &out))
	for d := xml.NewDecoder(strings.NewReader(b.String())); ; {
		if _, err := d.Token(); err != nil {
			require.ErrorIs(t, err, io.EOF)
			return out, b.String()
		}
	}
}

func TestJUnit(t *testing.T) {
	for name, c := range map[string]struct {
		scenario
		tests, failures, errors, skipped int
	}{
		"over":                           {closed, 6, 1, 0, 0},
		"open":                           {opened, 6, 0, 0, 0},
		"unproven":                       {unprove, 6, 0, 4, 0},
		"only warned":                    {warnOnly, 6, 0, 0, 4},
		"over, and unproven only warned": {warnOver, 6, 1, 0, 3},
		"no rule":                        {noRule, 0, 0, 0, 0},
	} {
		t.Run(name, func(t *testing.T) {
			s := c.judge(t)
			out, _ := read(t, s)
			suite := out.Suite
			require.Equal(t, []int{c.tests, c.failures, c.errors, c.skipped}, []int{suite.Tests, suite.Failures, suite.Errors, suite.Skipped})
			require.Equal(t, "2031-03-10T12:00:00", suite.Timestamp)
			require.Len(t, suite.Cases, c.tests)
			var failures, errors, skipped int
			for n, tc := range suite.Cases {
				failures += told1(tc.Failure)
				errors += told1(tc.Error)
				skipped += told1(tc.Skipped)
				require.Equal(t, "budgetcheck."+string(s.Rulings[n].Kind), tc.Class)
				require.Contains(t, tc.Name, s.Rulings[n].Name)
			}
			require.Equal(t, []int{c.failures, c.errors, c.skipped}, []int{failures, errors, skipped}, "as the counts say")
		})
	}
}

func told1(m *message) int {
	if m == nil {
		return 0
	}
	return 1
}

func TestJUnitSaysWhyAndWhere(t *testing.T) {
	out, _ := read(t, closed.judge(t))
	failed := out.Suite.Cases[0]
	require.Equal(t, "main, one training run, job retrain-tide", failed.Name)
	require.Regexp(t, `^over, observed 2.37 ± 0.46 kg, limit 2.20 kg, within the limit with a probability of 22.\d %$`, failed.Failure.Message)
	require.Equal(t, "budgetcheck.toml:65: "+failed.Failure.Message, failed.Failure.Text)
	require.Equal(t, "within", out.Suite.Cases[2].Out, "evidence has no figures")
}

// A policy need not have an [evidence] table, and then no line has the rule.
func TestJUnitWithoutAPlace(t *testing.T) {
	s := noHead.judge(t)
	s.Rulings = []budget.Ruling{{Kind: budget.KindEvidence, Name: "evidence", State: budget.Unproven, Reason: "there is no head run to judge"}}
	out, _ := read(t, s)
	require.Equal(t, "unproven: there is no head run to judge", out.Suite.Cases[0].Error.Text)
	require.Equal(t, "evidence", out.Suite.Cases[0].Name)
}

func TestHostileTextIsInertInJUnit(t *testing.T) {
	_, benign := read(t, filled(t, "tide"))
	for n, text := range hostile() {
		t.Run(fmt.Sprint(n), func(t *testing.T) {
			s := filled(t, text)
			out, whole := read(t, s)
			require.Len(t, out.Suite.Cases, len(s.Rulings))
			require.Equal(t, strings.Count(benign, "\n"), strings.Count(whole, "\n"))
			requireInertLines(t, whole)
			require.True(t, strings.HasPrefix(out.Suite.Cases[0].Name, Inert(text)[:min(len(Inert(text)), 900)]))
		})
	}
}
