package budget_test

import (
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/pelletier/go-toml/v2"
	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// bareRuns weighs records without a policy.
func bareRuns(t *testing.T, series string, records ...sketch) []*footprint.Run {
	t.Helper()
	p, set := budget.Bare(), seriesOf(t, series)
	var parts []*footprint.Part
	for _, s := range records {
		parts = append(parts, weigh(t, p, set, s.file, s.text(t)))
	}
	runs, stray := p.Runs(parts)
	require.Empty(t, stray)
	return runs
}

// Without a policy a site is its zone, and what is assumed is said.
func TestBare(t *testing.T) {
	runs := bareRuns(t, steady, night(func(s *sketch) { s.open.Site = "NORTH" }))
	require.Len(t, runs, 1)
	r := runs[0]
	assert.Equal(t, []any{unit.Energy(1), unit.Energy(1), unit.Mass(100), (*unit.Mass)(nil)}, []any{*r.MachineKWh, *r.Facility, *r.Total, r.Embodied})
	assert.Contains(t, strings.Join(r.Notes, "\n"), "no policy: the site is taken as the grid zone, with PUE 1, measured share 1 and no embodied emissions")

	p := budget.Bare()
	s := p.Judge(budget.Case{Branch: "main", Now: now, PolicySource: "no policy"})
	assert.Equal(t, budget.Open, s.Gate, "no rule applies")
}

// What a policy leaves out counts 1, and the run says so.
func TestAssumed(t *testing.T) {
	s := sceneOf(night())
	s.policy = edit(t, plain, "zone = \"NORTH\"\npue = 1.0\n", "zone = \"NORTH\"\n", "measured_share = 1.0\n", "")
	st := checkFine(t, s, "as if 1")
	notes := strings.Join(st.Runs[0].Notes, "\n")
	assert.Contains(t, notes, "site quay-north declares no PUE: 1 is taken")
	assert.Contains(t, notes, "machine quad declares no measured_share: 1 is taken")
	assert.EqualValues(t, 100, *st.Runs[0].Total)
}

func TestStarter(t *testing.T) {
	records := []sketch{
		night(func(s *sketch) { s.open.Site = "SOUTH" }),
		night(called("b.ndjson", "n2"), scaled(2), later(-unit.Day), func(s *sketch) { s.open.Site = "NORTH" }),
		night(called("c.ndjson", "n3"), meters(2), func(s *sketch) {
			s.open.Job, s.open.Stage, s.open.Machine, s.open.Reserved, s.open.Site = "score-tide", "evaluation", "octo", 8, "NORTH"
		}),
	}
	s := budget.NewStarter(bareRuns(t, steady, records...), []string{"grid/*.csv"})
	assert.Equal(t, []string{"NORTH", "SOUTH"}, s.Sites)
	assert.Equal(t, [][]any{{"quad", 1., 4}, {"octo", 8., 0}}, shown(s.Machines))
	assert.Equal(t, []budget.StarterJob{{Name: "retrain-tide", Stage: "training", Limit: "250 g"}, {Name: "score-tide", Stage: "evaluation", Limit: "62.5 g"}}, s.Jobs,
		"a quarter more than the largest run")
	assert.Len(t, s.Unknown, 4)

	s = budget.NewStarter(bareRuns(t, header, records...), nil)
	assert.Equal(t, "2.50 kWh", s.Jobs[0].Limit, "without a series limits are energies")
	assert.Contains(t, s.Unknown[len(s.Unknown)-1], "the carbon intensity")
	assert.Empty(t, budget.NewStarter(bareRuns(t, steady, night(meters(0))), nil).Jobs[0].Limit, "no figure, no limit")
}

func shown(machines []budget.StarterMachine) (list [][]any) {
	for _, m := range machines {
		list = append(list, []any{m.Name, m.Units, m.Meters})
	}
	return list
}

// Records of the whole machine and of some of its units tell together how many
// units there are, in whichever order they come.
func TestStarterUnits(t *testing.T) {
	whole := night()
	half := night(called("b.ndjson", "n2"), meters(2), later(-unit.Day), func(s *sketch) { s.open.Reserved = 2 })
	for _, records := range [][]sketch{{whole, half}, {half, whole}} {
		s := budget.NewStarter(bareRuns(t, steady, records...), nil)
		assert.Equal(t, [][]any{{"quad", 4., 4}}, shown(s.Machines))
	}
}

// Whatever a record calls its site, the starter policy reads it back.
func TestQuote(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		text := rapid.OneOf(rapid.String(), rapid.StringOf(rapid.SampledFrom([]rune("\"\\\n\r\t\a\v\x00\x1f\x7f\u202eé😀#]=")))).Draw(t, "text")
		quoted := budget.Starter{}.Quote(text)
		for _, c := range []byte(quoted) {
			require.True(t, c >= ' ' && c <= '~', "%q is plain", quoted)
		}
		var back struct{ X string }
		require.NoError(t, toml.Unmarshal([]byte("x = "+quoted), &back))
		require.Equal(t, strings.ToValidUTF8(text, "\uFFFD"), back.X)
	})
	assert.True(t, utf8.ValidString(budget.Starter{}.Quote("\xff")))
}
