package budget_test

import (
	"testing"

	"github.com/stretchr/testify/assert"

	"budgetcheck/budget"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// half is a run on half of a machine, of the meters given.
func half(file, run string, meters ...string) func(*sketch) {
	return func(s *sketch) {
		called(file, run)(s)
		s.open.Reserved, s.meters, s.watts = 2, meters, []float64{250, 251}
		if run == "n2" {
			s.watts[0]++ // two runs never read the same
		}
	}
}

func later(d unit.Duration) func(*sketch) {
	return func(s *sketch) { s.open.At = s.open.At.Add(d) }
}

// One device cannot be in two runs at once: its energy would be two runs'.
func TestMeterInTwoRuns(t *testing.T) {
	a, b := half("a.ndjson", "n1", "gpu0", "gpu1"), half("b.ndjson", "n2", "gpu1", "gpu2")
	s := sceneOf(night(a), night(b, later(30*unit.Minute)))
	checkDoubt(t, s, "counted twice: a.ndjson and b.ndjson both have meter gpu1 of host mole-1 from 2031-03-10T02:30:00Z on")
	s.policy = edit(t, plain, `"150 g"`, `"10 g"`)
	assert.Equal(t, budget.Over, ruling(t, s.judge(t), "one training").State, "a small twin is no way out")

	checkFine(t, sceneOf(night(a), night(b, later(unit.Hour))), "one after the other")
	checkFine(t, sceneOf(night(a), night(half("b.ndjson", "n2", "gpu2", "gpu3"))), "other devices")
	elsewhere := map[string]func(*sketch){
		"host": func(s *sketch) { s.open.Host = "mole-2" },
		"site": func(s *sketch) { s.open.Site, s.watts = "quay-south", []float64{100, 101} },
		"none": func(s *sketch) { s.open.Host = "" },
	}
	for name, other := range elsewhere {
		checkFine(t, sceneOf(night(a), night(b, other)), "another "+name)
	}
	// A long run does not hide behind a short one that starts within it.
	long := night(half("a.ndjson", "n1", "gpu0", "gpu1"), func(s *sketch) { s.length = 3 * unit.Hour; s.watts = []float64{25, 25} })
	short := night(half("b.ndjson", "n2", "gpu0", "gpu3"), later(10*unit.Minute))
	third := night(half("c.ndjson", "n3", "gpu0", "gpu2"), later(2*unit.Hour))
	checkDoubt(t, sceneOf(long, short, third), "a.ndjson and b.ndjson both have meter gpu0", "a.ndjson and c.ndjson both have meter gpu0")
}

// A base run's device counts as well.
func TestMeterInHeadAndBase(t *testing.T) {
	s := sceneOf(night(called("head.ndjson", "n1")))
	s.base = []sketch{night(called("base.ndjson", "n0"), scaled(1.1), later(-30*unit.Minute))}
	st := checkDoubt(t, s, "base.ndjson and head.ndjson both have meter gpu0 of host mole-1")
	assert.Zero(t, st.Changes[0].BaseRuns, "neither is evidence")
}

func TestMoreUnitsThanThereAre(t *testing.T) {
	of := func(units float64, run string, meters ...string) sketch {
		return night(half(run+".ndjson", run, meters...), func(s *sketch) { s.open.Reserved = units })
	}
	s := sceneOf(of(2, "n1", "a", "b"), of(2.5, "n2", "c", "d"))
	s.policy = edit(t, plain, "meters = 4\n", "")
	checkDoubt(t, s, "counted twice: 4.5 of the 4 units of host mole-1 are reserved at 2031-03-10T02:00:00Z", "n2.ndjson")
	s.head = []sketch{of(2, "n1", "a", "b"), of(2, "n2", "c", "d")}
	checkFine(t, s, "all the units there are")
	s.head = []sketch{of(0, "n1", "a", "b"), of(1, "n2", "c", "d")}
	checkDoubt(t, s, "counted twice: 5 of the 4 units")
	s.head[1].open.At = two.Add(unit.Hour)
	checkFine(t, s, "one after the other")
	s.head = []sketch{of(5, "n1", "a", "b")}
	checkDoubt(t, s, "n1.ndjson reserves 5 of the 4 units of machine quad")
}

// Each of three runs may be the one too many.
func TestAllThatShareAreDoubted(t *testing.T) {
	s := sceneOf(night(half("a.ndjson", "n1", "a", "b")), night(half("b.ndjson", "n2", "c", "d")), night(half("c.ndjson", "n3", "e", "f")))
	s.head[2].watts = []float64{260, 261}
	s.policy = edit(t, plain, "meters = 4\n", "")
	st := checkDoubt(t, s, "counted twice: 6 of the 4 units of host mole-1")
	for _, r := range st.Runs {
		if !assert.NotEmpty(t, r.Doubts, "run %s", r.Run) {
			continue
		}
		assert.Contains(t, r.Doubts[0].Reason, "counted twice", "run %s", r.Run)
	}
}

// Totals are of no meter: two runs may have them side by side on one host.
func TestTotalsSideBySide(t *testing.T) {
	total := func(run string, kwh unit.Energy) sketch {
		return night(half(run+".ndjson", run), func(s *sketch) {
			s.meters, s.watts = nil, nil
			s.used = []record.Used{{From: two, To: two.Add(unit.Hour), Energy: kwh, Measured: true}}
		})
	}
	scene := func(records ...sketch) *scene {
		s := sceneOf(records...)
		s.policy = edit(t, plain, "meters = 4\n", "")
		return s
	}
	checkFine(t, scene(total("n1", 0.4), total("n2", 0.5)), "each on its half")
	whole := total("n2", 0.5)
	whole.open.Reserved = 0
	checkDoubt(t, scene(total("n1", 0.4), whole), "counted twice: 6 of the 4 units")
}

// The parts of one run are checked like those of two.
func TestMeterInTwoParts(t *testing.T) {
	same := func(s *sketch) { s.open.Host = "mole-1" }
	s := sceneOf(night(part("0"), same), night(part("1"), same))
	checkDoubt(t, s, "part-0.ndjson and part-1.ndjson both have meter gpu0 of host mole-1")
}
