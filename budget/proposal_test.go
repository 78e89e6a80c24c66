package budget_test

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
)

// filesOf are policy files from pairs of name and text.
func filesOf(pairs ...string) (files []budget.PolicyFile) {
	for n := 0; n < len(pairs); n += 2 {
		files = append(files, budget.PolicyFile{Name: pairs[n], Data: []byte(pairs[n+1])})
	}
	return files
}

func edits(t *testing.T, base string, pairs ...string) []budget.Edit {
	t.Helper()
	return budget.PolicyEdits(filesOf("budgetcheck.toml", base), filesOf("budgetcheck.toml", edit(t, base, pairs...)))
}

func TestEditsOfAPolicy(t *testing.T) {
	for name, c := range map[string]struct {
		pairs []string
		want  []budget.Edit
	}{
		"nothing":          {nil, nil},
		"only a comment":   {[]string{"format = 1", "format = 1 # the first"}, nil},
		"only the order":   {[]string{"zone = \"NORTH\"\npue = 1.0", "pue = 1.0\nzone = \"NORTH\""}, nil},
		"another notation": {[]string{`"150 g"`, `'150 g'`}, nil},
		"a value": {[]string{`"150 g"`, `"900 g"`},
			[]budget.Edit{{Table: `budget "one training"`, Key: "limit", From: "150 g", To: "900 g"}}},
		"a key more": {[]string{"pue = 1.0\n\n[site.quay-south]", "pue = 1.0\nmarket = \"305 g/kWh\"\n\n[site.quay-south]"},
			[]budget.Edit{{Table: "site.quay-north", Key: "market", To: "305 g/kWh"}}},
		"a key less": {[]string{"required = true\n", ""},
			[]budget.Edit{{Table: `job "retrain-tide"`, Key: "required", From: "true"}}},
		"a list": {[]string{"required = true\n", "required = true\nsites = [\"quay-north\", \"quay-south\"]\n"},
			[]budget.Edit{{Table: `job "retrain-tide"`, Key: "sites", To: "[quay-north, quay-south]"}}},
		"at the top": {[]string{"format = 1", "format = 2"},
			[]budget.Edit{{Key: "format", From: "1", To: "2"}}},
		"another name": {[]string{"name = \"one training\"\nbranch = \"main\"\njob = \"retrain-tide\"\nlimit = \"150 g\"\nper = \"run\"", "name = \"two\"\nlimit = \"150 g\""}, []budget.Edit{
			{Table: `budget "one training"`, Key: "name", From: "one training"}, {Table: `budget "one training"`, Key: "branch", From: "main"},
			{Table: `budget "one training"`, Key: "job", From: "retrain-tide"}, {Table: `budget "one training"`, Key: "limit", From: "150 g"},
			{Table: `budget "one training"`, Key: "per", From: "run"},
			{Table: `budget "two"`, Key: "name", To: "two"}, {Table: `budget "two"`, Key: "limit", To: "150 g"}}},
	} {
		t.Run(name, func(t *testing.T) { assert.ElementsMatch(t, c.want, edits(t, plain, c.pairs...)) })
	}
}

// Tables in an array go by their names, wherever they stand: one that moves is
// no edit, and one between others shifts none.
func TestEditsGoByName(t *testing.T) {
	one, two := "\n[[budget]]\nname = \"a\"\nlimit = \"1 g\"\n", "\n[[budget]]\nname = \"b\"\nlimit = \"2 g\"\n"
	files := func(text string) []budget.PolicyFile { return filesOf("budgetcheck.toml", text) }
	assert.Empty(t, budget.PolicyEdits(files(one+two), files(two+one)))
	assert.Equal(t, []budget.Edit{{Table: `budget "a"`, Key: "limit", From: "1 g", To: "3 g"}},
		budget.PolicyEdits(files(one+two), files(two+strings.Replace(one, "1 g", "3 g", 1))))
	waiver := "[[waiver]]\nrule = \"a\"\nextra = \"1 g\"\n"
	assert.Equal(t, []budget.Edit{{Table: `waiver "a"`, Key: "extra", From: "1 g", To: "2 g"}},
		budget.PolicyEdits(files(waiver), files(strings.Replace(waiver, "1 g", "2 g", 1))))
}

// Two tables of one name are two tables: neither hides an edit of the other.
func TestEditsOfTablesOfOneName(t *testing.T) {
	job := func(stage, work string) string {
		return "\n[[job]]\nname = \"tide\"\nstage = \"" + stage + "\"\nwork = \"" + work + "\"\n"
	}
	base := filesOf("budgetcheck.toml", job("training", "5 step")+job("evaluation", "7 step"))
	head := filesOf("budgetcheck.toml", job("training", "6 step")+job("evaluation", "7 step"))
	got := budget.PolicyEdits(base, head)
	assert.Equal(t, []budget.Edit{{Table: `job "tide"`, Key: "work", From: "5 step", To: "6 step"}}, got)
	head = filesOf("budgetcheck.toml", job("training", "5 step")+job("evaluation", "8 step"))
	assert.Equal(t, []budget.Edit{{Table: `job "tide" (2)`, Key: "work", From: "7 step", To: "8 step"}}, budget.PolicyEdits(base, head))
}

// Files add up: a table that moves to another file is no edit.
func TestEditsOfSeveralFiles(t *testing.T) {
	one, two := "format = 1\n[site.a]\nzone = \"N\"\n", "[site.b]\nzone = \"S\"\n"
	base := filesOf("a.toml", one, "b.toml", two)
	assert.Empty(t, budget.PolicyEdits(base, filesOf("a.toml", one+two)))
	assert.Equal(t, []budget.Edit{{Table: "site.b", Key: "zone", From: "S", To: "W"}},
		budget.PolicyEdits(base, filesOf("a.toml", one, "b.toml", strings.Replace(two, "S", "W", 1))))
	assert.Equal(t, []budget.Edit{{Table: "site.b", Key: "zone", From: "S"}}, budget.PolicyEdits(base, filesOf("a.toml", one)))
	assert.Equal(t, []budget.Edit{{Table: "site.b", Key: "zone", From: "S"}}, budget.PolicyEdits(base, filesOf("a.toml", one, "b.toml", "[[[")), "what can be read is compared")
}

// judged is the night by plain, with a proposal of the head.
func proposed(t *testing.T, base, head string, power float64) *budget.Statement {
	t.Helper()
	s := sceneOf(night(scaled(power)))
	s.policy = base
	st := s.judge(t)
	p := budget.Proposal{Edits: budget.PolicyEdits(filesOf("budgetcheck.toml", base), filesOf("budgetcheck.toml", head))}
	_, p.Findings = budget.ParsePolicy(budget.PolicyFile{Name: "budgetcheck.toml", Data: []byte(head)})
	if len(p.Findings) == 0 {
		s.policy = head
		p.Preview = s.judge(t)
	}
	st.Propose(p)
	return st
}

// The head's policy changes no ruling, in neither direction; what it would
// make of the change is told.
func TestPreview(t *testing.T) {
	looser := edit(t, plain, `"150 g"`, `"900 g"`)
	st := proposed(t, plain, looser, 2)
	assert.Equal(t, budget.Closed, st.Gate, "a change cannot raise its own limit")
	require.Len(t, st.Changed(), 1)
	assert.Equal(t, []any{"one training", budget.Within, "900 g"}, []any{st.Changed()[0].Name, st.Changed()[0].State, st.Changed()[0].LimitText})

	tighter := edit(t, plain, `"150 g"`, `"90 g"`)
	st = proposed(t, plain, tighter, 1)
	assert.Equal(t, budget.Open, st.Gate, "it takes effect after merge")
	require.Len(t, st.Changed(), 1)
	assert.Equal(t, budget.Over, st.Changed()[0].State)
	assert.Equal(t, budget.Within, ruling(t, st, "one training").State)

	st = proposed(t, plain, plain+"\n[site.pier]\nzone = \"NORTH\"\n", 1)
	assert.NotEmpty(t, st.Edits)
	assert.Empty(t, st.Changed(), "an edit that changes no ruling")
}

// A policy that cannot be read would stop every later change: it closes the
// gate, even where unproven only warns, and names the place.
func TestPolicyOfTheHeadThatCannotBeUsed(t *testing.T) {
	warns := edit(t, plain, `unproven = "close"`, `unproven = "warn"`)
	for name, base := range map[string]string{"closes": plain, "warns": warns} {
		st := proposed(t, base, edit(t, base, `"150 g"`, `"150 pigeons"`), 1)
		assert.Equal(t, budget.Closed, st.Gate, name)
		require.NotEmpty(t, doubts(st))
		at := "budgetcheck.toml:" + lineNumber(t, base, "limit =")
		assert.Contains(t, strings.Join(doubts(st), "\n"), at+": ")
		assert.Contains(t, st.Reason, at, "and it is the first thing that is said")
		assert.False(t, st.Awaits(), "no record mends it")
	}
	// Also on a branch without budgets, where else nothing is ruled on.
	s := sceneOf(night())
	s.about.Branch = "harbour-works"
	st := s.judge(t)
	require.Equal(t, budget.Open, st.Gate)
	_, found := budget.ParsePolicy(budget.PolicyFile{Name: "budgetcheck.toml", Data: []byte("format = 2\n")})
	st.Propose(budget.Proposal{Findings: found})
	assert.Equal(t, budget.Closed, st.Gate)
	assert.Contains(t, st.Reason, "budgetcheck.toml:1")
}

// Where the target has no policy yet, the head's speaks and closes nothing.
func TestAdoption(t *testing.T) {
	for name, s := range map[string]*scene{"over": sceneOf(night(scaled(2))), "unproven": sceneOf(night(meters(3))), "no run": sceneOf()} {
		assert.Equal(t, budget.Closed, s.judge(t).Gate, name)
		s.about.Adoption = true
		st := s.judge(t)
		assert.Equal(t, budget.Open, st.Gate, name)
		assert.True(t, strings.HasPrefix(st.Reason, "branch main has no policy yet; by this change's own, "), st.Reason)
		assert.Contains(t, []budget.State{budget.Over, budget.Unproven}, st.Rulings[0].State, "and is not made better than it is")
		assert.False(t, st.Awaits(), "nothing is waited for")
	}
}
