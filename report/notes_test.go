package report

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/require"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

func noted(name string, notes ...string) *footprint.Run {
	return &footprint.Run{Run: name, Attempt: 1, Notes: notes}
}

func TestNotesSayWhoseTheyAre(t *testing.T) {
	for name, c := range map[string]struct {
		runs []*footprint.Run
		want []string
	}{
		"none":         {[]*footprint.Run{noted("a")}, nil},
		"one":          {[]*footprint.Run{noted("a", "n"), noted("b")}, []string{"run a: n"}},
		"the only run": {[]*footprint.Run{noted("a", "n")}, []string{"run a: n"}},
		"some":         {[]*footprint.Run{noted("a", "n"), noted("b"), noted("c", "n")}, []string{"runs a, c: n"}},
		"all":          {[]*footprint.Run{noted("a", "n"), noted("b", "n")}, []string{"all runs: n"}},
		"many": {[]*footprint.Run{noted("a", "n"), noted("b", "n"), noted("c", "n"), noted("d", "n"), noted("e", "n"), noted("f")},
			[]string{"runs a, b, c and 2 more: n"}},
		"two notes": {[]*footprint.Run{noted("a", "n", "m"), noted("b", "m")}, []string{"run a: n", "all runs: m"}},
	} {
		t.Run(name, func(t *testing.T) { require.Equal(t, c.want, allNotes(nil, c.runs)) })
	}
}

func TestNotesOfTheStatementComeFirst(t *testing.T) {
	own := []string{"first"}
	require.Equal(t, []string{"first", "run a: n"}, allNotes(own, []*footprint.Run{noted("a", "n")}))
	require.Equal(t, []string{"first"}, own)
}

func TestAttemptsAreToldApart(t *testing.T) {
	second := noted("a", "n")
	second.Attempt = 2
	require.Equal(t, []string{"run a, attempt 2: n"}, allNotes(nil, []*footprint.Run{noted("a"), second}))
}

// GHG Protocol Scope 2 Guidance: both methods, or a word that one is missing.
func TestOneBookIsSaid(t *testing.T) {
	kwh, g := unit.Energy(2), unit.Mass(610)
	r := noted("a")
	require.Empty(t, allNotes(nil, []*footprint.Run{r}), "nothing is known of it")
	r.Facility = &kwh
	require.Len(t, allNotes(nil, []*footprint.Run{r}), 1)
	require.Contains(t, allNotes(nil, []*footprint.Run{r})[0], "not dual-reported")
	r.Market = &g
	require.Empty(t, allNotes(nil, []*footprint.Run{r}))
	require.Empty(t, r.Notes)
}

func TestMarketIsShownBeside(t *testing.T) {
	out := asText(t, closed.judge(t))
	require.Contains(t, out, "market-based")
	require.Contains(t, out, "run score-tide-2031-03-10: not dual-reported")
	require.Equal(t, 1, strings.Count(out, "not dual-reported"), "quay-north has a market-based factor")
}
