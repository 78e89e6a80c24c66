package budget_test

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// meters keeps the first n meters.
func meters(n int) func(*sketch) {
	return func(s *sketch) { s.meters, s.watts = s.meters[:n], s.watts[:n] }
}

func TestMetersOfMachine(t *testing.T) {
	checkDoubt(t, sceneOf(night(meters(3))), "meter missing: night.ndjson has 3 of the 4 meters of machine quad")
	reserved := func(s *sketch) { s.open.Reserved = 2 }
	checkFine(t, sceneOf(night(meters(2), reserved)), "half the machine has half the meters")
	checkDoubt(t, sceneOf(night(meters(1), reserved)), "meter missing: night.ndjson has 1 of the 2 meters of machine quad")
	checkDoubt(t, sceneOf(night(meters(0))), "no energy: night.ndjson has no power, energy or used lines")
}

// Where the policy does not say how many meters there are, base runs do.
func TestMetersOfBase(t *testing.T) {
	s := sceneOf(night(meters(3), scaled(1.1)))
	s.policy = edit(t, plain, "meters = 4\n", "")
	checkFine(t, s, "nobody says how many there are")
	base := night(called("base.ndjson", "n0"), later(-unit.Day))
	s.base = []sketch{base}
	checkDoubt(t, s, "meter missing: night.ndjson has no gpu3, which base runs have")

	others := map[string]func(*sketch){
		"job":     func(s *sketch) { s.open.Job = "score-tide" },
		"stage":   func(s *sketch) { s.open.Stage = "evaluation" },
		"machine": func(s *sketch) { s.open.Machine = "lone" },
	}
	for name, other := range others {
		s.base = []sketch{base}
		other(&s.base[0])
		checkFine(t, s, "a base run of another "+name)
	}
	s.base, s.head = []sketch{base}, []sketch{night(scaled(1.1), func(s *sketch) { s.meters = []string{"gpu1", "gpu0", "gpu3", "gpu2"} })}
	checkFine(t, s, "the same meters in another order")
	s.base[0].meters, s.base[0].watts = nil, nil
	s.base[0].used = []record.Used{{From: s.base[0].open.At, To: two.Add(-23 * unit.Hour), Energy: 1, Measured: true}}
	checkFine(t, s, "a total is no meter to ask for")
}

func TestImplausiblePower(t *testing.T) {
	policy := edit(t, plain, "meters = 4\n", "meters = 4\nidle = \"900 W\"\nrated = \"1.2 kW\"\n", `"150 g"`, `"1 kg"`)
	check := func(change func(*sketch), words ...string) {
		s := sceneOf(night(change))
		s.policy = policy
		if len(words) == 0 {
			checkFine(t, s, "plausible")
			return
		}
		checkDoubt(t, s, words...)
	}
	check(scaled(1))
	check(scaled(0.9)) // exactly idle
	check(scaled(0.89), "night.ndjson: mean power of machine quad is 890 W, below its idle power of 900 W")
	reading := func(w float64) func(*sketch) {
		return func(s *sketch) {
			s.meters, s.watts = append(s.meters, "extra"), append(s.watts, w)
		}
	}
	check(reading(1200)) // exactly rated
	check(reading(1201), "night.ndjson:6: meter extra reads 1.20 kW, above the rated power", "61 readings are")
	zero := func(s *sketch) { s.watts = []float64{1000, 0, 0, 0} }
	check(zero, "meter gpu1 of night.ndjson measured no energy over the run", "meter gpu3")
}

// A reading that cannot be does not prove that a limit is passed.
func TestImplausiblePowerProvesNothing(t *testing.T) {
	s := sceneOf(night(scaled(10)))
	s.policy = edit(t, plain, "meters = 4\n", "meters = 4\nrated = \"1.2 kW\"\n")
	checkDoubt(t, s, "above the rated power")
}

// K: 1 kW over two hours with a 6 min hole in the second: coverage 0.95.
func TestCoverage(t *testing.T) {
	holed := func(minutes unit.Duration) *scene {
		s := sceneOf(night(func(s *sketch) {
			s.length, s.hole = 2*unit.Hour, [2]unit.Duration{70 * unit.Minute, (70 + minutes) * unit.Minute}
		}))
		s.policy = edit(t, plain, `"150 g"`, `"250 g"`)
		return s
	}
	st := checkFine(t, holed(6), "exactly at min_coverage")
	assert.InDelta(t, 0.95, float64(*st.Runs[0].Coverage), 1e-12)
	assert.EqualValues(t, "filled", st.Runs[0].Grade)

	st = checkDoubt(t, holed(7), "coverage of run n1 is 94.2 %, below 95.0 %")
	e := st.Rulings[0]
	require.Equal(t, budget.KindEvidence, e.Kind)
	assert.InDelta(t, 113.0/120, *e.Observed, 1e-12)
	assert.Equal(t, []any{0.95, "share"}, []any{*e.Limit, e.Unit})
}

func TestGrade(t *testing.T) {
	total := func(measured bool) sketch {
		return night(meters(0), func(s *sketch) {
			s.used = []record.Used{{From: two, To: two.Add(unit.Hour), Energy: 1, Measured: measured}}
		})
	}
	filled := night(func(s *sketch) { s.hole = [2]unit.Duration{10 * unit.Minute, 13 * unit.Minute} })
	runs := []sketch{night(), filled, total(true), total(false)}
	grades := []string{"measured", "filled", "averaged", "estimated"}
	for least, asked := range grades {
		for n, run := range runs {
			s := sceneOf(run)
			text := plain
			if n >= 2 { // a total is of no meter
				text = edit(t, plain, "meters = 4\n", "")
			}
			s.policy = edit(t, text, "[evidence]\n", "[evidence]\nmin_grade = \""+asked+"\"\nmin_coverage = 0.5\n")
			if n <= least {
				checkFine(t, s, grades[n]+" for "+asked)
			} else {
				checkDoubt(t, s, "run n1 is of grade "+grades[n]+"; the policy asks for "+asked+" or better")
			}
		}
	}
}

func TestTwoAccounts(t *testing.T) {
	s := sceneOf(night(func(s *sketch) {
		s.used = []record.Used{{From: two, To: two.Add(unit.Hour), Energy: 1, Measured: true}}
	}))
	checkDoubt(t, s, "two accounts of one run: night.ndjson has used lines and lines of meters")
	s.policy = edit(t, plain, `"150 g"`, `"50 g"`)
	assert.Equal(t, budget.Over, ruling(t, s.judge(t), "one training").State, "the meters alone pass the limit")
}

func TestTimes(t *testing.T) {
	end := two.Add(unit.Hour)
	at := func(clock unit.Instant) *scene {
		s := sceneOf(night())
		s.about.Now = clock
		return s
	}
	checkFine(t, at(end.Add(72*unit.Hour)), "as old as may be")
	st := checkDoubt(t, at(end.Add(72*unit.Hour+1)), "run n1 ended", "ago, more than")
	e := st.Rulings[0]
	assert.Equal(t, []any{72.0 * 3600, "s"}, []any{*e.Limit, e.Unit})

	checkFine(t, at(end.Add(-unit.Minute)), "a minute between two clocks")
	future := at(end.Add(-unit.Minute - 1))
	checkDoubt(t, future, "run n1 ends in the future, at 2031-03-10T03:00:00Z")
	future.policy = edit(t, plain, `"150 g"`, `"50 g"`)
	checkDoubt(t, future, "in the future")

	old := sceneOf(night())
	old.base = []sketch{night(called("base.ndjson", "n0"), later(-9*unit.Day))}
	checkFine(t, old, "base runs may be old")
}
