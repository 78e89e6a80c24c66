package budget_test

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
)

// parse reads texts as the files a.toml, b.toml, and so on.
func parse(texts ...string) (*budget.Policy, []string) {
	var files []budget.PolicyFile
	for n, text := range texts {
		files = append(files, budget.PolicyFile{Name: string(rune('a'+n)) + ".toml", Data: []byte(text)})
	}
	p, found := budget.ParsePolicy(files...)
	var lines []string
	for _, f := range found {
		lines = append(lines, f.String())
	}
	return p, lines
}

const (
	first  = "format = 1\n\n[evidence]\nmax_gap = \"3m\"\n\n[site.quay-north]\nzone = \"NORTH\"\n\n[[budget]]\nname = \"a\"\nlimit = \"1 kg\"\nper = \"run\"\n"
	second = "[evidence]\nmax_age = \"1h\"\n\n[site.quay-south]\nzone = \"SOUTH\"\n\n[[budget]]\nname = \"b\"\nlimit = \"1 kg\"\nper = \"run\"\n"
)

func TestFilesAddUp(t *testing.T) {
	for _, text := range []string{second, "format = 1\n" + second} {
		p, found := parse(first, text)
		require.Empty(t, found)
		assert.Equal(t, []string{"a.toml", "b.toml"}, p.Files)
		assert.Equal(t, []string{"3 min", "1 h"}, []string{p.Evidence.MaxGap.Text(1), p.Evidence.MaxAge.Text(1)}, "one table of two files")
		assert.Equal(t, []string{"NORTH", "SOUTH"}, []string{p.Sites["quay-north"].Zone, p.Sites["quay-south"].Zone})
		a, b := p.Budgets[0], p.Budgets[1]
		assert.Equal(t, []any{"a", "a.toml", 9, "b", "b.toml", lineOf(t, text, "[[budget]]")}, []any{a.Name, a.File, a.Line, b.Name, b.File, b.Line})
	}
	p, found := parse(second, first)
	require.Empty(t, found, "which file says the format does not matter")
	assert.Equal(t, "b", p.Budgets[0].Name, "rules stand in the order of the files")
}

func TestFilesContradict(t *testing.T) {
	cases := []struct{ text, want string }{
		{"[evidence]\nmax_gap = \"3m\"\n", "b.toml:2: max_gap is already set at a.toml:4; set each key in one policy file"},
		{"\n[site.quay-north]\nzone = \"SOUTH\"\n", "b.toml:3: zone is already set at a.toml:7; set each key in one policy file"},
		{"# a newer one\nformat = 2\n", "b.toml:2: format is already set at a.toml:1; set each key in one policy file"},
		{"evidence = 3\n", "b.toml:1: evidence is already set at a.toml:3; set each key in one policy file"},
		{"[[budget]]\nname = \"a\"\nlimit = \"1 kg\"\nper = \"run\"\n", "b.toml:2: rule \"a\" stands twice; give each rule a name of its own"},
		// A table that two files share knows which of them each key stands in.
		{"\n[evidence]\nmin_coverage = 95\n", "b.toml:3: evidence.min_coverage is 9500 %; write a share up to 1"},
		{"\n[evidence]\nmin_grades = \"filled\"\n", "b.toml:3: unknown key evidence.min_grades; use one of max_age, max_gap, min_coverage, min_grade, same_inputs, unproven; did you mean min_grade?"},
	}
	for _, c := range cases {
		_, found := parse(first, c.text)
		assert.Equal(t, []string{c.want}, found)
	}
	_, found := parse("# no format here\n", "# c\nformat = 3\n")
	assert.Equal(t, []string{"b.toml:2: format is 3; this version reads format 1; write that, or use a newer budgetcheck"}, found)
}

func TestNamesStandOnce(t *testing.T) {
	const head = "format = 1\n"
	rule := "[[budget]]\nname = \"a\"\nlimit = \"1 kg\"\nper = \"run\"\n"
	_, found := parse(head + rule + rule + "[[regression]]\nmax_rise = \"5%\"\nname = \"a\"\n")
	assert.Equal(t, []string{"a.toml:7: rule \"a\" stands twice; give each rule a name of its own",
		"a.toml:12: rule \"a\" stands twice; give each rule a name of its own"}, found)

	job := "[[job]]\nname = \"j\"\n"
	stage := func(s string) string { return "stage = \"" + s + "\"\n" }
	_, found = parse(head + job + stage("x") + job + stage("y"))
	assert.Empty(t, found, "a job may stand once for each stage")
	_, found = parse(head + job + stage("x") + job + stage("x"))
	assert.Equal(t, []string{"a.toml:6: job \"j\" stands twice; write one table for each job and stage"}, found)
	_, found = parse(head + job + job + stage("x"))
	assert.Equal(t, []string{"a.toml:5: job \"j\" stands twice; write one table for each job and stage"}, found)
}

// Lines are those of the table and of the key, however it is written.
func TestLines(t *testing.T) {
	rule := func(name string) string {
		return "\n# rule\n[[budget]] # " + name + "\nname = \"" + name + "\"\nlimit = \"1 kg\"\nper = \"run\"\n"
	}
	p, found := parse("format = 1\n" + rule("a") + rule("b") + "[[job]]\nname = \"j\"\n" + rule("c"))
	require.Empty(t, found)
	var lines []int
	for _, b := range p.Budgets {
		lines = append(lines, b.Line)
	}
	assert.Equal(t, []int{4, 10, 18}, lines)

	p, found = parse("format = 1\nbudget = [\n  # one\n  {name = \"a\", limit = \"1 kg\", per = \"run\"},\n\n  {name = \"b\",\n   limit = \"1 kg\", per = \"run\"},\n]\n")
	require.Empty(t, found)
	assert.Equal(t, []int{4, 6}, []int{p.Budgets[0].Line, p.Budgets[1].Line}, "tables in a list")

	_, found = parse("format = 1\nsite.north = { zone = \"N\", pue = 0.5 }\nsite.south.zone = \"S\"\nsite.south.pue = 0.5\n[grid]\nseries = [\n  \"a.csv\",\n  7,\n]\n")
	assert.Equal(t, []string{"a.toml:2: the PUE of site north is 0.5; write facility energy over IT energy, from 1 up",
		"a.toml:4: the PUE of site south is 0.5; write facility energy over IT energy, from 1 up",
		"a.toml:8: grid.series is 7; write a text in quotation marks"}, found)
}

func TestSyntax(t *testing.T) {
	cases := []struct {
		name, text string
		line       int
		what       string
	}{
		{"a header without its end", "format = 1\n\n[account\n", 3, "expected ']'"},
		{"a text without its end", "format = 1\n[account]\ntimezone = \"UTC\n", 3, "toml: "},
		{"no value", "format =\n", 1, "toml: "},
		{"a key twice", "format = 1\n[account]\nfactor = \"average\"\nfactor = \"marginal\"\n", 4, "factor is already defined"},
		{"a table twice", "format = 1\n[account]\n[grid]\n[account]\n", 4, "account already exists"},
		{"a number beyond 64 bit", "# c\nformat = 99999999999999999999\n", 2, "too large"},
		{"no UTF-8 in a text", "format = 1\n[account]\ntimezone = \"\xff\"\n", 3, "invalid UTF-8"},
		{"no UTF-8 in a comment", "format = 1\n# \xff\n", 2, "invalid UTF-8"},
	}
	for _, c := range cases {
		found := findings(c.text)
		require.Len(t, found, 1, c.name)
		f := found[0]
		assert.Equal(t, []any{"budgetcheck.toml", c.line, "mend the TOML"}, []any{f.File, f.Line, f.Do}, c.name)
		assert.Contains(t, f.What, c.what, c.name)
	}
	_, lines := parse("format = [\n", first, "x = y\n")
	require.Len(t, lines, 2, "each file is read: %v", lines)
	assert.True(t, strings.HasPrefix(lines[0], "a.toml:") && strings.HasPrefix(lines[1], "c.toml:1:"), "%v", lines)
}

// Some editors start a file with a byte order mark.
func TestByteOrderMark(t *testing.T) {
	_, found := parse("\ufeff" + first)
	assert.Empty(t, found)
	_, found = parse("\ufeff" + first + "[grd]\n")
	require.Len(t, found, 1)
	assert.True(t, strings.HasPrefix(found[0], "a.toml:13: unknown key grd"), "%v", found)
}

// One mistake hides no other, and all are told in the order in which they stand.
func TestAllFindings(t *testing.T) {
	_, found := parse(
		"format = 1\n[acount]\n\n[evidence]\nmin_grade = \"fine\"\nmax_gap = \"0s\"\n\n[[job]]\nname = \"j\"\nschedule = \"never\"\nsites = [\"x\",\n\"y\"]\n",
		"[evidence]\nmax_age = 3\nmax_gap = \"3m\"\n\n[[waiver]]\nrule = \"r\"\nreason = \"q\"\napproved_by = \"a\"\nexpires = \"then\"\n")
	want := []string{"a.toml:2: unknown key acount", "a.toml:5: evidence.min_grade is", "a.toml:6: evidence.max_gap is 0 s", "a.toml:10: the schedule of job j",
		"a.toml:11: site \"x\" is not in the policy", "a.toml:12: site \"y\" is not in the policy",
		"b.toml:2: evidence.max_age: \"3\" is not a duration", "b.toml:3: max_gap is already set at a.toml:6", "b.toml:6: the waiver names rule \"r\"", "b.toml:9: waiver.expires is not a date"}
	require.Len(t, found, len(want), "%v", found)
	for n := range want {
		assert.True(t, strings.HasPrefix(found[n], want[n]), "%s is told as %s", want[n], found[n])
	}
}

func TestGuardedNeedsUncertainty(t *testing.T) {
	const want = "a.toml:3: account.decision is guarded but no uncertainty is declared; declare account.uncertainty, or write simple"
	for _, declared := range []string{"", "uncertainty = {}\n", "[account.uncertainty]\n"} {
		_, found := parse("format = 1\n[account]\ndecision = \"guarded\"\n" + declared)
		assert.Equal(t, []string{want}, found)
	}
	_, found := parse("format = 1\n[account]\ndecision = \"guarded\"\nuncertainty = { pue = \"3%\" }\n")
	assert.Empty(t, found)
}

// A glob that somebody wrote empty is not taken for all branches.
func TestEmptyGlob(t *testing.T) {
	for _, key := range []string{"branch", "job", "stage"} {
		_, found := parse("format = 1\n[[budget]]\nname = \"a\"\n" + key + " = \"\"\nlimit = \"1 kg\"\nper = \"run\"\n")
		require.Len(t, found, 1)
		assert.Contains(t, found[0], "a.toml:4: "+key+" has the glob \"\"")
		_, found = parse("format = 1\n[[regression]]\nname = \"a\"\n" + key + " = \"[\"\nmax_rise = 0.1\n")
		require.Len(t, found, 1)
		assert.Contains(t, found[0], "a.toml:4: "+key+" has the glob \"[\"")
	}
}

func TestLimits(t *testing.T) {
	limit := func(text string) budget.Limit {
		p := policyOf(t, "format = 1\n[[budget]]\nname = \"a\"\nper = \"run\"\nlimit = \""+text+"\"\n")
		return p.Budgets[0].Limit
	}
	assert.EqualValues(t, 1.2e6, *limit("1.2 t").Mass)
	assert.EqualValues(t, 0.35, *limit("350 Wh").Energy)
	assert.EqualValues(t, 2, *limit("7.2 MJ").Energy)
	r := limit("1.2 g per 1000 step").Rate
	assert.EqualValues(t, []any{1.2, 1000.0, "step"}, []any{float64(r.Mass), r.Per, r.Unit})
	assert.Nil(t, limit("1 kg").Energy)
	assert.Nil(t, limit("3 mg per token").Mass)
	for text, shown := range map[string]string{"40 kg": "40.0 kg", "12 kWh": "12.0 kWh", "1.2 g per 1000 step": "1.20 g per 1000 step"} {
		assert.Equal(t, shown, limit(text).String())
	}
}
