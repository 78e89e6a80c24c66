package budget_test

import (
	"encoding/json"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/finding"
)

// A program that reads the statement finds a list of runs even where there are
// none, which is when it matters most.
func TestNoRunsIsAnEmptyList(t *testing.T) {
	s := policyOf(t, plain).Judge(budget.Case{Branch: "main", Now: now, PolicySource: "budgetcheck.toml"})
	text, err := json.Marshal(s)
	require.NoError(t, err)
	assert.Contains(t, string(text), `"runs":[]`)
}

// Hosts may call their meters differently: a part is compared with the same
// part of the base.
func TestMetersOfBaseByPart(t *testing.T) {
	named := func(run, name, meter string) sketch {
		return night(called(run+name+".ndjson", run), func(s *sketch) {
			s.open.Part, s.open.Parts, s.open.Host, s.open.Reserved = name, 2, "mole-"+name, 2
			s.meters, s.watts = []string{meter}, []float64{300}
		})
	}
	early := func(s sketch) sketch { later(-48 * 60 * 60e9)(&s); scaled(1.01)(&s); return s }
	s := sceneOf(named("n1", "0", "a"), scaledBy(named("n1", "1", "b"), 1.1))
	s.policy = edit(t, plain, "meters = 4\n", "", `"150 g"`, `"1 kg"`)
	s.base = []sketch{early(named("n0", "0", "a")), early(scaledBy(named("n0", "1", "b"), 1.2))}
	checkFine(t, s, "each part has the meters of its base")
	s.head[1].meters = []string{"other"}
	checkDoubt(t, s, "meter missing: n11.ndjson has no b, which base runs have")
}

func scaledBy(s sketch, factor float64) sketch {
	scaled(factor)(&s)
	return s
}

// What meters a base record had that cannot be read is not known.
func TestBrokenBaseIsNoBase(t *testing.T) {
	policy := policyOf(t, edit(t, plain, "meters = 4\n", ""))
	set := seriesOf(t, steady)
	one := night()
	c := budget.Case{Branch: "main", Now: now, PolicySource: "budgetcheck.toml"}
	c.Head = append(c.Head, weigh(t, policy, set, one.file, one.text(t)))
	assert.Equal(t, budget.Open, policy.Judge(c).Gate)
	c.UnreadBase = []finding.Finding{{File: "base.ndjson", What: "the file cannot be read"}}
	assert.Contains(t, policy.Judge(c).Reason, "base record base.ndjson cannot be read")
	c.UnreadBase = nil
	c.Base = append(c.Base, weigh(t, policy, set, "torn.ndjson", "garbage\n"))
	assert.Contains(t, policy.Judge(c).Reason, "base record torn.ndjson cannot be read")
}
