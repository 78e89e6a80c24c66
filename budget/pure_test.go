package budget_test

import (
	"encoding/json"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/record"
)

// crowd is a case with something of everything: parts, attempts, copies, the
// same part twice, records that are none, devices in two runs, and a base.
func crowd(t test) (*budget.Policy, budget.Case) {
	t.Helper()
	p, set, c := policyOf(t, plain), seriesOf(t, steady), sceneOf().about
	take := func(to *[]*footprint.Part, sketches ...sketch) {
		for _, s := range sketches {
			*to = append(*to, weigh(t, p, set, s.file, s.text(t)))
		}
	}
	again := func(file string) func(*sketch) { return func(s *sketch) { s.file = file } }
	take(&c.Head, night(part("0")), night(part("1")), night(part("1"), again("same.ndjson")),
		night(part("0"), scaled(1.1), again("other.ndjson")),
		attempt(3, record.OK), attempt(2, record.Failed),
		night(called("copy-a.ndjson", "n7"), scaled(1.2)), night(called("copy-b.ndjson", "n8"), scaled(1.2)), night(called("copy-c.ndjson", "n9"), scaled(1.2)),
		night(called("gulls.ndjson", "n5"), func(s *sketch) { s.open.Job, s.lines = "count-gulls", []string{"{}", "[]"} }))
	for _, file := range []string{"x.ndjson", "a.ndjson", "m.ndjson"} {
		c.Head = append(c.Head, weigh(t, p, set, file, "not a record\n"))
		c.Base = append(c.Base, weigh(t, p, set, "base-"+file, ""))
	}
	take(&c.Base, compared(night(), 1, 2, 0.5, 3).base...)
	take(&c.Base, night(called("late.ndjson", "n6"), scaled(1.3)), night(part("0")))
	return p, c
}

// The gate is a pure function: it changes nothing that it is given.
func TestJudgeIsPure(t *testing.T) {
	p, c := crowd(t)
	c.Notes = append(make([]string, 0, 8), "read with care")
	once := p.Judge(c)
	assert.Equal(t, once, p.Judge(c))
	again, fresh := crowd(t)
	fresh.Notes = c.Notes
	assert.Equal(t, machineText(t, once), machineText(t, again.Judge(fresh)), "nor does it keep anything")
	assert.Equal(t, []string{"read with care"}, c.Notes)
	require.NotEmpty(t, doubts(once))
}

// In which order files are given says nothing about the change.
func TestOrderOfPartsDoesNotMatter(t *testing.T) {
	p, c := crowd(t)
	want := machineText(t, p.Judge(c))
	rapid.Check(t, func(t *rapid.T) {
		mixed := c
		mixed.Head = rapid.Permutation(c.Head).Draw(t, "head")
		mixed.Base = rapid.Permutation(c.Base).Draw(t, "base")
		require.Equal(t, want, machineText(t, p.Judge(mixed)))
	})
}

// Whatever a record says, the statement can be written: a bad record must not
// stop the gate from telling so.
func TestAbsurdRecords(t *testing.T) {
	absurd := map[string]func(*sketch){
		"power beyond all measure": func(s *sketch) { s.watts = []float64{1.7e308, 1.7e308, 1e308, 1} },
		"power next to nothing":    func(s *sketch) { s.watts = []float64{5e-324, 5e-324, 5e-324, 5e-324} },
		"work next to nothing":     func(s *sketch) { s.work[0].Done = 5e-324 },
		"work beyond all measure":  func(s *sketch) { s.work[0].Done, s.work[0].Planned = 1e308, 1.7e308 },
		"a total beyond all measure": func(s *sketch) {
			s.meters, s.watts = nil, nil
			s.used = []record.Used{{From: two, To: two + 1, Energy: 1.7e308}}
		},
		"a reservation of nothing": func(s *sketch) { s.open.Reserved = 5e-324 },
		"a reservation of all":     func(s *sketch) { s.open.Reserved = 1.7e308 },
	}
	for name, change := range absurd {
		for _, limit := range []string{"150 g", "1 kWh", "1 g per step"} {
			for _, base := range []bool{false, true} {
				s := sceneOf(night(change))
				if base {
					s = compared(night(), 1)
					change(&s.base[0])
				}
				s.policy = edit(t, plain, `"150 g"`, `"`+limit+`"`, "meters = 4\n", "embodied = \"1 t\"\nlifetime = \"4y\"\n")
				st := s.judge(t)
				_, err := json.Marshal(st)
				assert.NoError(t, err, "%s, %s", name, limit)
				if strings.HasSuffix(name, "beyond all measure") && !base {
					r := ruling(t, st, "one training")
					assert.Equal(t, budget.Unproven, r.State, "%s, %s", name, limit)
					assert.Regexp(t, `night\.ndjson:\d+: .* beyond anything|cannot be; mend night\.ndjson`, strings.Join(doubts(st), "\n"))
				}
			}
		}
	}
}
