package report

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

const demoDir = "../testdata/demo"

// scenario is the demo, with something changed.
type scenario struct {
	branch string   // main if empty
	edit   []string // in the policy: old, new, old, new
	noBase bool
	head   string // glob below the demo's folder; all head records if empty
}

// judge judges the scenario.
func (sc scenario) judge(t *testing.T) *budget.Statement {
	t.Helper()
	p := demoPolicy(t, sc.edit...)
	now, err := unit.ParseInstant("2031-03-10T12:00:00Z")
	require.NoError(t, err)
	c := budget.Case{Branch: or(sc.branch, "main"), Pull: 214, Now: now, PolicySource: strings.Join(p.Files, " and ")}
	c.Head = sc.weighed(t, p, or(sc.head, "head/*"))
	if !sc.noBase {
		c.Base = sc.weighed(t, p, "base/*")
	}
	return p.Judge(c)
}

// kept are weighed parts by scenario and glob. Judging leaves them as they are.
var kept = map[string][]*footprint.Part{}

func (sc scenario) weighed(t *testing.T, p *budget.Policy, glob string) []*footprint.Part {
	t.Helper()
	key := fmt.Sprint(sc.edit, glob)
	if kept[key] == nil {
		kept[key] = weighed(t, p, glob)
	}
	return kept[key]
}

func or(text, instead string) string {
	if text == "" {
		return instead
	}
	return text
}

// demoPolicy is the demo's policy with replacements, each of which must apply.
func demoPolicy(t *testing.T, edit ...string) *budget.Policy {
	t.Helper()
	data, err := os.ReadFile(filepath.Join(demoDir, "budgetcheck.toml"))
	require.NoError(t, err)
	text := string(data)
	for n := 0; n < len(edit); n += 2 {
		require.Contains(t, text, edit[n])
		text = strings.ReplaceAll(text, edit[n], edit[n+1])
	}
	p, found := budget.ParsePolicy(budget.PolicyFile{Name: "budgetcheck.toml", Data: []byte(text)})
	require.Empty(t, found)
	return p
}

func weighed(t *testing.T, p *budget.Policy, glob string) (parts []*footprint.Part) {
	t.Helper()
	set := demoSeries(t, p)
	for _, path := range below(t, glob) {
		f, err := os.Open(path)
		require.NoError(t, err)
		defer f.Close()
		r, err := record.NewReader(f, path)
		require.NoError(t, err)
		part, err := p.Weigh(r, set)
		require.NoError(t, err)
		parts = append(parts, part)
	}
	return parts
}

func demoSeries(t *testing.T, p *budget.Policy) *grid.Set {
	t.Helper()
	var files []*grid.File
	for _, path := range below(t, "grid/*") {
		f, err := os.Open(path)
		require.NoError(t, err)
		defer f.Close()
		file, err := grid.ReadCSV(f, path, p.Grid.ColumnNames())
		require.NoError(t, err)
		files = append(files, file)
	}
	return grid.NewSet(p.Grid.Boundary, files...)
}

// below are the demo's files that the glob matches; there must be some.
func below(t *testing.T, glob string) []string {
	t.Helper()
	paths, err := filepath.Glob(filepath.Join(demoDir, glob))
	require.NoError(t, err)
	require.NotEmpty(t, paths, glob)
	return paths
}

// The states that tests of the forms need, each made from the demo.
var (
	closed   = scenario{}
	opened   = scenario{edit: []string{`limit = "2.2 kg"`, `limit = "2.4 kg"`}}
	unprove  = scenario{edit: []string{`min_coverage = 0.95`, `min_coverage = 0.999`, `limit = "2.2 kg"`, `limit = "2.4 kg"`}}
	warnOver = scenario{edit: []string{`unproven = "close"`, `unproven = "warn"`, `min_coverage = 0.95`, `min_coverage = 0.999`}}
	warnOnly = scenario{edit: append([]string{`unproven = "close"`, `unproven = "warn"`}, unprove.edit...)}
	noRule   = scenario{branch: "harbour-works"}
	noBase   = scenario{noBase: true}
	noHead   = scenario{head: "head/score-tide.ndjson"}
)

func TestScenariosAreWhatTheyAreCalled(t *testing.T) {
	for _, c := range []struct {
		scenario
		gate  budget.Gate
		worst budget.State
	}{
		{closed, budget.Closed, budget.Over}, {opened, budget.Open, budget.Near}, {unprove, budget.Closed, budget.Unproven},
		{warnOnly, budget.Open, budget.Unproven}, {noBase, budget.Closed, budget.Over}, {noHead, budget.Closed, budget.Unproven},
	} {
		s := c.judge(t)
		require.Equal(t, c.gate, s.Gate)
		require.Equal(t, c.worst, s.Rulings[0].State)
	}
	s := noRule.judge(t)
	require.Equal(t, budget.Open, s.Gate)
	require.Empty(t, s.Rulings)
}
