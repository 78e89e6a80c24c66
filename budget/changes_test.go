package budget_test

import (
	"math"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// compared is a head run with base runs on the days before it.
func compared(head sketch, powers ...float64) *scene {
	s := sceneOf(head)
	s.policy = strings.Replace(plain, `"150 g"`, `"1 t"`, 1)
	for n, by := range powers {
		id := "base-" + string(rune('a'+n))
		s.base = append(s.base, night(called(id+".ndjson", id), scaled(by), later(-unit.Duration(n+1)*unit.Day)))
	}
	return s
}

// K: E 100 to 126.5 kWh, PUE 1.2 to 1.14, I 400 to 500, no embodied: 0.265.
func TestHeldGrid(t *testing.T) {
	s := compared(night(scaled(1.265), func(s *sketch) { s.open.Site = "quay-south" }), 1)
	s.policy = edit(t, s.policy, "zone = \"NORTH\"\npue = 1.0", "zone = \"NORTH\"\npue = 1.2", "zone = \"SOUTH\"\npue = 1.0", "zone = \"SOUTH\"\npue = 1.14")
	s.series = edit(t, steady, "100,average", "400,average", "200,average", "500,average")
	st := s.judge(t)
	require.Len(t, st.Changes, 1)
	c := st.Changes[0]
	assert.Equal(t, []any{"retrain-tide", "training", 1, 1}, []any{c.Job, c.Stage, c.BaseRuns, c.HeadRuns})
	assert.InDelta(t, 0.265, *c.HeldRatio, 1e-12)
	assert.InEpsilon(t, 1*1.2*400, float64(*c.Base), 1e-12)
	assert.InEpsilon(t, 1.265*1.14*500, float64(*c.Head), 1e-12)
	assert.InEpsilon(t, 1.265*1.14*500-480, float64(*c.Change), 1e-12)
	assert.InEpsilon(t, 480, float64(*c.BaseHeld), 1e-12)
	assert.InEpsilon(t, 480*1.265, float64(*c.HeadHeld), 1e-12)
}

// Held figures are geometric means, those as charged arithmetic.
func TestSeveralBaseRuns(t *testing.T) {
	c := compared(night(), 1, 4, 2).judge(t).Changes[0]
	assert.Equal(t, 3, c.BaseRuns)
	assert.InEpsilon(t, (100+400+200)/3., float64(*c.Base), 1e-12)
	assert.InEpsilon(t, 100*math.Cbrt(1*4*2), float64(*c.BaseHeld), 1e-12)
	assert.InEpsilon(t, 1/2., *c.HeldRatio+1, 1e-12)
}

func TestOneSideOnly(t *testing.T) {
	assert.Empty(t, compared(night()).judge(t).Changes, "no base, no change")
	s := compared(night(func(s *sketch) { s.open.Job = "score-tide" }), 1)
	s.policy += "\n[[job]]\nname = \"score-tide\"\n"
	changes := s.judge(t).Changes
	require.Len(t, changes, 2)
	for n, job := range []string{"retrain-tide", "score-tide"} {
		c := changes[n]
		assert.Equal(t, []any{job, 1 - n, n}, []any{c.Job, c.BaseRuns, c.HeadRuns})
		assert.Equal(t, []bool{n == 0, n == 1, true, true}, []bool{c.Base != nil, c.Head != nil, c.Change == nil, c.HeldRatio == nil}, "what does not apply is absent")
	}
}

// Zero emissions on a side give no ratio, and no infinity.
func TestZeroSide(t *testing.T) {
	s := compared(night(), 1)
	s.series = edit(t, steady, "100,average", "0,average")
	st := s.judge(t)
	c := st.Changes[0]
	assert.EqualValues(t, []any{0.0, 0.0}, []any{float64(*c.Base), float64(*c.Head)})
	assert.Nil(t, c.HeldRatio)
	assert.NotContains(t, machineText(t, st), "held_ratio")
}

// A base run whose evidence is in doubt is left out and named.
func TestDoubtfulBaseRuns(t *testing.T) {
	doubtful := map[string]func(*sketch){
		"cannot count":                  func(s *sketch) { s.lines = []string{"{}"} },
		"its outcome is failed":         func(s *sketch) { s.outcome = record.Failed },
		"its outcome is cancelled":      func(s *sketch) { s.outcome = record.Cancelled },
		"meter missing":                 meters(3),
		"is a pilot":                    func(s *sketch) { s.work[0].Planned = 5000 },
		"part missing":                  func(s *sketch) { s.open.Part, s.open.Parts = "0", 2 },
		"is not in the policy":          func(s *sketch) { s.open.Site = "quay-east" },
		"coverage of run base-b is 8":   func(s *sketch) { s.hole = [2]unit.Duration{10 * unit.Minute, 20 * unit.Minute} },
		"measured no energy over the r": func(s *sketch) { s.watts[2] = 0 },
	}
	for reason, change := range doubtful {
		t.Run(reason, func(t *testing.T) {
			s := compared(night(), 1, 2)
			change(&s.base[1])
			st := s.judge(t)
			c := st.Changes[0]
			assert.Equal(t, 1, c.BaseRuns)
			assert.InEpsilon(t, 100, float64(*c.Base), 1e-12)
			notes := strings.Join(st.Notes, "\n")
			assert.Contains(t, notes, "base run base-b takes no part in the comparison: ")
			assert.Contains(t, notes, reason)
			assert.Equal(t, budget.Open, st.Gate, "the head is not at fault")
		})
	}
	s := compared(night(func(s *sketch) { s.lines = []string{"{}"} }), 1)
	st := s.judge(t)
	assert.Zero(t, st.Changes[0].HeadRuns)
	assert.Contains(t, strings.Join(st.Notes, "\n"), "head run n1 takes no part in the comparison: ")
}

// No run counts on both sides.
func TestRunOnBothSides(t *testing.T) {
	s := compared(night(), 1)
	s.base = append(s.base, s.head[0])
	st := s.judge(t)
	assert.Equal(t, []int{1, 1}, []int{st.Changes[0].BaseRuns, st.Changes[0].HeadRuns})
	assert.Contains(t, st.Notes, "run n1 is given as base and as head: it counts as head")
	require.Len(t, st.Runs, 2)
	assert.Equal(t, []string{"base", "head"}, []string{st.Runs[0].Side, st.Runs[1].Side})
	assert.Equal(t, budget.Open, st.Gate)

	s = compared(night(), 1)
	s.base = append(s.base, attempt(2, record.OK))
	s.base[1].open.At = two.Add(-unit.Hour - 1)
	assert.Equal(t, 2, s.judge(t).Changes[0].BaseRuns, "another attempt is another run")
}
