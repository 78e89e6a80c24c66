package report

import (
	"fmt"
	"regexp"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
)

func asText(t *testing.T, s *budget.Statement) string {
	t.Helper()
	var b strings.Builder
	require.NoError(t, Text(&b, s))
	return b.String()
}

func TestFirstLineIsTheVerdict(t *testing.T) {
	for _, c := range []struct {
		scenario
		want string
	}{
		{closed, "Gate closed: main, one training run is over by 172 g: 2.37 kg of 2.20 kg (of 6 rulings 1 over, 1 near, 4 within)"},
		{opened, "Gate open: of 6 rulings 2 near, 4 within"},
		{noRule, "Gate open: no rule of budgetcheck.toml applies to branch harbour-works"},
		{noHead, "Gate closed: unproven: job retrain-tide is required, and there is no head run of it (of 6 rulings 4 unproven, 2 within)"},
		{warnOnly, "Gate open: the policy only warns: "},
	} {
		s := c.judge(t)
		first, _, _ := strings.Cut(asText(t, s), "\n")
		require.True(t, strings.HasPrefix(first, c.want), "%s", first)
		var b strings.Builder
		require.NoError(t, Markdown(&b, s))
		markdown, _, _ := strings.Cut(b.String(), "\n")
		require.Equal(t, first, strings.NewReplacer("*", "", "`", "").Replace(markdown), "Markdown says the same")
	}
}

// The parts come in the order in which people need them.
func TestOrderOfParts(t *testing.T) {
	parts := []string{"Gate closed", "Branch", "Accounts", "for each run", "From base to head", "Rulings", "Runs", "Notes", Caution}
	var b strings.Builder
	require.NoError(t, Markdown(&b, closed.judge(t)))
	for _, statement := range []string{asText(t, closed.judge(t)), b.String()} {
		at := -1
		for _, part := range parts {
			next := strings.Index(statement, part)
			require.Greater(t, next, at, part)
			at = next
		}
		require.True(t, strings.HasSuffix(statement, Caution+"\n"))
	}
}

func TestHostileTextIsInertInText(t *testing.T) {
	want := strings.Count(asText(t, filled(t, "tide")), "\n")
	for n, text := range hostile() {
		t.Run(fmt.Sprint(n), func(t *testing.T) {
			s := filled(t, text)
			out := asText(t, s)
			requireInertLines(t, out)
			if text != "-" { // nothing but that in a column leaves the column out of both
				require.Equal(t, want, strings.Count(out, "\n"))
			}
		})
	}
}

func TestHostileTextIsInertInWeigh(t *testing.T) {
	var plainOnes strings.Builder
	require.NoError(t, Runs(&plainOnes, []*footprint.Run{hostileRun("tide")}, []string{"tide"}))
	for n, text := range hostile() {
		t.Run(fmt.Sprint(n), func(t *testing.T) {
			var b strings.Builder
			require.NoError(t, Runs(&b, []*footprint.Run{hostileRun(text)}, []string{text}))
			requireInertLines(t, b.String())
			require.Equal(t, strings.Count(plainOnes.String(), "\n"), strings.Count(b.String(), "\n"))
		})
	}
}

// requireInertLines checks what a terminal and a CI system that reads its own
// log would see.
func requireInertLines(t *testing.T, out string) {
	t.Helper()
	require.NotContains(t, out, "##")
	for _, line := range strings.Split(out, "\n") {
		require.False(t, strings.HasPrefix(strings.TrimSpace(line), "::"), "%.200q", line)
		for _, r := range line {
			require.True(t, plain(r), "%q in %.200q", r, line)
		}
	}
}

// Every number that people read has a unit, and three significant figures.
func TestNumbersHaveUnits(t *testing.T) {
	out := asText(t, closed.judge(t))
	quantities := regexp.MustCompile(`(\d[\d.]*)( ± [\d.]+)? (?:(?:g/kWh|kWh|kg|mg|g|Wh|h|min)\b|%)`).FindAllStringSubmatch(out, -1)
	require.Greater(t, len(quantities), 80)
	for _, q := range quantities {
		if q[1] == "0" {
			continue
		}
		require.Len(t, strings.TrimLeft(strings.Replace(q[1], ".", "", 1), "0"), 3, q[0])
	}
	// Words that count, names with digits, times and policy lines are no quantities.
	rest := regexp.MustCompile(`(\d[\d.]*)( ± [\d.]+)? (?:(?:g/kWh|kWh|kg|mg|g|Wh|h|min)\b|%)`).ReplaceAllString(out, "")
	rest = regexp.MustCompile(`retrain-tide-\S+|score-tide-\S+|\d{4}-\d\d-\d\d\S*|\d\d:\d\dZ|per 1000 step|k = 2|\d+ (runs?|base runs?|head runs?|rulings|over|near|within) ?|6 to 1|0 to 1|request 214`).ReplaceAllString(rest, "")
	rest = regexp.MustCompile(`(?m) +\d\d$`).ReplaceAllString(rest, "") // policy lines, the last column
	require.NotRegexp(t, `\d`, rest)
}

// Where two figures would print alike, both show enough of themselves.
func TestFiguresThatDecideAreToldApart(t *testing.T) {
	observed := *closed.judge(t).Rulings[0].Observed // 2372.235... g
	require.InDelta(t, 2372.2355, observed, 1e-3)
	out := asText(t, scenario{edit: []string{`limit = "2.2 kg"`, `limit = "2.372 kg"`}}.judge(t))
	require.Contains(t, out, "2.3722 kg of 2.3720 kg")
	require.Contains(t, out, "2.3722 kg (2.37 ± 0.46 kg)")
}

func TestNoColour(t *testing.T) {
	require.NotContains(t, asText(t, closed.judge(t)), "\x1b")
}
