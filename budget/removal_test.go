package budget_test

import (
	"slices"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"pgregory.net/rapid"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
)

// standing is what a statement says of each rule: the worst, by kind and name.
type standing map[string]budget.State

func standingOf(s *budget.Statement) standing {
	m := standing{}
	for _, r := range s.Rulings { // worst first
		if key := string(r.Kind) + " " + r.Name; m[key] == "" {
			m[key] = r.State
		}
	}
	return m
}

func bad(s budget.State) bool { return s == budget.Over || s == budget.Unproven }

// without is the record without any line of the meter.
func (s sketch) without(meter string) sketch {
	n := slices.Index(s.meters, meter)
	s.meters = slices.Delete(slices.Clone(s.meters), n, n+1)
	s.watts = slices.Delete(slices.Clone(s.watts), n, n+1)
	s.lines = slices.DeleteFunc(slices.Clone(s.lines), func(line string) bool { return strings.Contains(line, `"meter":"`+meter+`"`) })
	return s
}

// removal checks one case against what is left of it.
type removal struct {
	*rapid.T
	drawn
	policy *budget.Policy
	c      budget.Case
	was    *budget.Statement
	before standing
}

// check judges again with other head parts.
func (r *removal) check(head []*footprint.Part, what string) {
	less := r.c
	less.Head = head
	is := r.policy.Judge(less)
	after := standingOf(is)
	for rule, state := range r.before {
		if bad(state) && !bad(after[rule]) {
			r.Fatalf("%s was %s and is %q without %s\n%s\n%s", rule, state, after[rule], what, r.drawn.policy, machineText(r, is))
		}
	}
	if r.was.Gate == budget.Closed && r.policy.Evidence.Unproven == "close" && is.Gate != budget.Closed {
		r.Fatalf("the gate opens without %s\n%s", what, r.drawn.policy)
	}
}

// each removes every record, and of every record one meter.
func (r *removal) each() {
	set := seriesOf(r, r.series)
	for n, s := range r.records {
		r.check(slices.Delete(slices.Clone(r.c.Head), n, n+1), s.file)
		if s.raw != "" || len(s.meters) == 0 {
			continue
		}
		meter := rapid.SampledFrom(s.meters).Draw(r.T, "meter")
		head := slices.Clone(r.c.Head)
		head[n] = weigh(r, r.policy, set, s.file, s.without(meter).text(r))
		r.check(head, meter+" of "+s.file)
	}
}

// Whoever loses evidence, or hides it, must not gain by it: without a record,
// or without a meter, nothing that was over or unproven is within, or only
// near, and no closed gate opens. (Where the policy only warns of what is
// unproven, the gate may: that is what it asks for.)
func TestRemovingEvidenceNeverHelps(t *testing.T) {
	seen := map[budget.State]int{}
	rapid.Check(t, func(t *rapid.T) {
		r := removal{T: t, drawn: drawCase(t), c: sceneOf().about}
		r.policy = policyOf(t, r.drawn.policy)
		r.c.Head = r.weighAll(t, r.policy)
		r.was = r.policy.Judge(r.c)
		r.before = standingOf(r.was)
		for _, state := range r.before {
			seen[state]++
		}
		r.each()
	})
	if testing.Short() {
		return // too few cases to reach every state
	}
	for _, state := range []budget.State{budget.Over, budget.Unproven, budget.Near, budget.Within} {
		assert.Positive(t, seen[state], "the cases drawn reach %s: %v", state, seen)
	}
}
