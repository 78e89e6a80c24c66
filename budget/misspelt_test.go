package budget_test

import (
	"regexp"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/finding"
)

// findings parses one file that may have anything wrong with it.
func findings(text string) []finding.Finding {
	_, found := budget.ParsePolicy(budget.PolicyFile{Name: "budgetcheck.toml", Data: []byte(text)})
	return found
}

// misspellings are words that somebody meant as key: a letter doubled, a capital
// at the end, and in longer words a letter left out or mistyped.
func misspellings(key string) (words []string) {
	for n := range key {
		words = append(words, key[:n]+key[n:n+1]+key[n:])
		if len(key) > 4 {
			words = append(words, key[:n]+key[n+1:], key[:n]+"9"+key[n+1:])
		}
	}
	return append(words, key[:len(key)-1]+strings.ToUpper(key[len(key)-1:]))
}

// checkMisspelt asks for one finding that names the key, its line and the word
// that was meant.
func checkMisspelt(t *testing.T, text string, line int, word, meant string) {
	t.Helper()
	var unknown []finding.Finding
	for _, f := range findings(text) {
		if strings.HasPrefix(f.What, "unknown key ") {
			unknown = append(unknown, f)
		}
	}
	require.Len(t, unknown, 1, word)
	f := unknown[0]
	assert.Equal(t, []any{"budgetcheck.toml", line}, []any{f.File, f.Line}, word)
	assert.True(t, strings.HasSuffix(f.What, word), "%q names %s", f.What, word)
	assert.Contains(t, f.Do, "use one of ")
	assert.True(t, strings.HasSuffix(f.Do, "did you mean "+meant+"?"), "%q means %s", f.Do, meant)
}

// Every known key of every table, misspelt, must not pass in silence: a limit
// that nobody reads would never close a gate.
func TestMisspeltKeys(t *testing.T) {
	pair := regexp.MustCompile(`^(\w+)(\s*=.*)$`)
	lines := strings.Split(sample, "\n")
	keys := 0
	for n, line := range lines {
		m := pair.FindStringSubmatch(line)
		if m == nil {
			continue
		}
		keys++
		for _, word := range misspellings(m[1]) {
			lines[n] = word + m[2]
			checkMisspelt(t, strings.Join(lines, "\n"), n+1, word, m[1])
		}
		lines[n] = line
	}
	assert.Equal(t, 71, keys, "the sample has every key")
}

func TestMisspeltTables(t *testing.T) {
	header := regexp.MustCompile(`^(\[+)(\w+)(.*)$`)
	lines := strings.Split(sample, "\n")
	tables := 0
	for n, line := range lines {
		m := header.FindStringSubmatch(line)
		if m == nil || strings.HasPrefix(m[3], ".columns") || m[2] == "site" || m[2] == "machine" {
			continue // [grid.columns] belongs to [grid]; there are several sites and machines
		}
		tables++
		for _, word := range misspellings(m[2]) {
			if m[2] == "grid" { // both tables move along
				text := strings.ReplaceAll(sample, "[grid", "["+word)
				checkMisspelt(t, text, n+1, word, "grid")
				continue
			}
			lines[n] = m[1] + word + m[3]
			checkMisspelt(t, strings.Join(lines, "\n"), n+1, word, m[2])
		}
		lines[n] = line
	}
	assert.Equal(t, 7, tables)
	checkMisspelt(t, "format = 1\n\n[sites.quay-north]\nzone = \"NORTH\"\n", 3, "sites", "site")
	checkMisspelt(t, "format = 1\n\n[machines.quad]\n", 3, "machines", "machine")
}

// Keys are found wherever TOML lets them be written.
func TestMisspeltElsewhere(t *testing.T) {
	const unmetered = "format = 1\n[machine.lone]\nunmeterd = \"320 W\"\n"
	checkMisspelt(t, unmetered, 3, "unmeterd", "unmetered")
	inline := edit(t, sample, `pue = "3%"`, `puee = "3%"`)
	checkMisspelt(t, inline, at(t, "uncertainty = {"), "puee", "pue")
	dotted := "format = 1\naccount.factor = \"average\"\naccount.uncertainty.metre = \"2%\"\n"
	checkMisspelt(t, dotted, 3, "metre", "meter")
	quoted := "format = 1\n[machine.\"quad\"]\n\"ratedd\" = \"2 kW\"\n"
	checkMisspelt(t, quoted, 3, "ratedd", "rated")
	list := "format = 1\nbudget = [\n  {name = \"a\", limit = \"1 kg\", per = \"run\"},\n  {name = \"b\", limit = \"1 kg\", per = \"run\",\n    lnading = \"warn\"},\n]\n"
	checkMisspelt(t, list, 5, "lnading", "landing")
}

// A word that is like none of the keys gets no guess.
func TestUnlikeAnyKey(t *testing.T) {
	found := findings("format = 1\n[grid]\nwaterline = 3\n")
	require.Len(t, found, 1)
	assert.Equal(t, "budgetcheck.toml:3: unknown key grid.waterline; use one of boundary, columns, series", found[0].String())
}
