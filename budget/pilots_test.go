package budget_test

import (
	"fmt"
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// k6 are the batches of NUMBERS' pilot, kWh for 100 units each: b 0.1 kWh a
// unit, 405 kWh for 4000 units after a start-up of 5 kWh, half-width 36.26.
var k6 = []float64{10, 11, 9, 10, 12, 10, 9, 9}

// pilot is a run with a start-up of 5 kWh in its first hour, then one batch an
// hour, with work lines every so many minutes.
func pilot(batches []float64, every int, planned float64, changes ...func(*sketch)) sketch {
	s := night(called("pilot.ndjson", "p1"), ranOn("b"))
	s.meters, s.watts, s.work = nil, nil, nil
	s.length = unit.Duration(len(batches)+1) * unit.Hour
	s.every, s.outcome = unit.Hour, record.Pilot
	line := func(at unit.Duration, format string, a ...any) {
		s.lines = append(s.lines, fmt.Sprintf(format, append([]any{s.open.At.Add(at)}, a...)...))
	}
	for _, change := range changes {
		change(&s)
	}
	var j float64
	read := func(at unit.Duration) {
		for m := range 4 {
			line(at, `{"k":"energy","at":"%s","meter":"gpu%d","j":%.6f}`, m, j/4)
		}
	}
	read(0)
	j += 5 * unit.JoulesPerKWh
	read(unit.Hour)
	work := func(minute int) {
		if minute%every == 0 {
			line(unit.Hour+unit.Duration(minute)*unit.Minute, `{"k":"work","at":"%s","unit":"step","done":%.9g,"planned":%.9g}`, float64(minute)*100/60, planned)
		}
	}
	work(0)
	for n, kwh := range batches {
		for minute := 5; minute <= 60; minute += 5 {
			j += kwh / 12 * unit.JoulesPerKWh
			read(unit.Hour + unit.Duration(n)*unit.Hour + unit.Duration(minute)*unit.Minute)
			work(60*n + minute)
		}
	}
	return s
}

// pilotScene judges a pilot of a pull request; intensity 100 g/kWh.
func pilotScene(p sketch, limit string) *scene {
	s := inPull(creeping(""), 6, p)
	s.policy = plainLimit(limit)
	for n := range s.books { // nights of 4000 units, 400 kWh each
		s.books[n].sketch = scaledOf(s.books[n].sketch, 400)
		s.books[n].work = []record.Work{{Unit: "step", Done: 4000}}
	}
	return s
}

func plainLimit(limit string) string {
	return fmt.Sprintf("%s\n[[regression]]\nname = \"no creep\"\nmax_rise = \"5%%\"\n", replaceLimit(limit))
}

func replaceLimit(limit string) string {
	return plain[:len(plain)-len("limit = \"150 g\"\nper = \"run\"\n")] + "limit = \"" + limit + "\"\nper = \"run\"\n"
}

// K of NUMBERS 6, from the file and from the books.
func TestPilotProjects(t *testing.T) {
	for _, given := range []bool{true, false} {
		p := pilot(k6, 5, 4000)
		s := pilotScene(p, "1 t")
		if !given {
			s.head, s.books = nil, append(s.books, bookedAs("pull/7", p))
		}
		st := s.judge(t)
		r := st.Runs[len(st.Runs)-1]
		assert.Empty(t, doubts(st))
		require.NotNil(t, r.ProjectedKWh)
		tolerance := 1e-6
		if !given {
			tolerance = 0.005 // the books keep fewer steps
		}
		assert.InEpsilon(t, 405, float64(*r.ProjectedKWh), tolerance)
		assert.InEpsilon(t, 40500, grams(t, r.ProjectedTotal), tolerance)
		assert.InDelta(t, 40500-3626, grams(t, r.ProjectedLow), 5+tolerance*40500)
		assert.InDelta(t, 40500+3626, grams(t, r.ProjectedHigh), 5+tolerance*40500)
		assert.InEpsilon(t, 85, float64(*r.Facility), 1e-9, "what it emitted is what it is charged")
		assert.InEpsilon(t, 8500, grams(t, r.Total), 1e-9)
	}
}

// A pilot meets budgets by its projection with its interval: 405 kWh within
// 368.7 to 441.3, 40.5 kg, 10.125 g a unit.
func TestPilotMeetsBudgets(t *testing.T) {
	for limit, want := range map[string]budget.State{
		"442 kWh": budget.Within, "441 kWh": budget.Near, "405.1 kWh": budget.Near, "404.9 kWh": budget.Unproven, "369 kWh": budget.Unproven, "368 kWh": budget.Over,
		"44.2 kg": budget.Within, "40.6 kg": budget.Near, "40.4 kg": budget.Unproven, "36.8 kg": budget.Over,
		"11.1 g per step": budget.Within, "10.2 g per step": budget.Near, "10.1 g per step": budget.Unproven, "9.2 g per step": budget.Over,
	} {
		r := ruling(t, pilotScene(pilot(k6, 5, 4000), limit).judge(t), "one training")
		assert.Equal(t, want, r.State, "%s: %s", limit, r.Reason)
	}
}

// A pilot is charged what it emitted, and closes no period by what it did not.
func TestPilotIsCharged(t *testing.T) {
	for _, given := range []bool{true, false} {
		p := pilot(k6, 5, 4000)
		s := pilotScene(p, "1 t")
		s.policy += "\n[[budget]]\nname = \"month\"\nlimit = \"9 kg\"\nper = \"pull\"\n"
		if !given {
			s.head, s.books = nil, append(s.books, bookedAs("pull/7", p))
		}
		st := s.judge(t)
		assert.Equal(t, budget.Within, ruling(t, st, "month").State)
		assert.InDelta(t, 8500, spentIn(t, st), 1e-6)
	}
}

// Too few lines, too little work, or a load that is not settled tell nothing of
// the rest; what the pilot emitted is proven all the same.
func TestPilotThatTellsNothing(t *testing.T) {
	rising := []float64{5, 6, 7, 8, 9, 10, 11, 12}
	for what, p := range map[string]sketch{
		"not settled":  pilot(rising, 5, 4000),
		"work lines":   pilot(k6, 60, 4000),
		"planned work": pilot(k6, 5, 40000),
	} {
		st := pilotScene(p, "1 t").judge(t)
		r := ruling(t, st, "one training")
		assert.Equal(t, budget.Unproven, r.State, what)
		assert.Contains(t, r.Reason, what)
		assert.Equal(t, budget.Unproven, ruling(t, st, "no creep").State)
		assert.Equal(t, budget.Closed, st.Gate)
		assert.Equal(t, budget.Over, ruling(t, pilotScene(p, "70 kWh").judge(t), "one training").State, "the measured part alone")
		assert.Equal(t, budget.Over, ruling(t, pilotScene(p, "7 kg").judge(t), "one training").State, "the measured part alone")
	}
}

// Whatever the interval of a projection, what is measured is spent.
func TestMeasuredPartOfWildPilot(t *testing.T) {
	wild := []float64{1, 1, 1, 30, 1, 1, 1, 1}
	p := pilot(wild, 5, 8000)
	for limit, want := range map[string]budget.State{"41.9 kWh": budget.Over, "4.19 kg": budget.Over, "42.1 kWh": budget.Unproven} {
		r := ruling(t, pilotScene(p, limit).judge(t), "one training")
		assert.Equal(t, want, r.State, "42 kWh are measured, limit %s: %s", limit, r.Reason)
	}
}

// In a comparison the projection enters with its variance (405 kWh to 400).
func TestPilotInRegression(t *testing.T) {
	st := pilotScene(pilot(k6, 5, 4000), "1 t").judge(t)
	require.Len(t, st.Changes, 1)
	c := st.Changes[0]
	assert.InDelta(t, 5/400., *c.HeldRatio, 1e-6)
	u := 36.26 / 2.364624 / 405 // t(0.975, 7)
	se := math.Sqrt(0.005*0.005*(1+1/6.) + u*u)
	assert.InDelta(t, (1+5/400.)*math.Exp(-2.015048*se)-1, *c.LowRatio, 1e-5) // t(0.95, 5)
	assert.InDelta(t, (1+5/400.)*math.Exp(2.015048*se)-1, *c.HighRatio, 1e-5)
	assert.InDelta(t, 500, grams(t, c.Change), 1e-3)
	assert.InDelta(t, 500, sumOf(c.Bridge), 1e-3)
}

// A pilot is projected to the job's next start: by night 50 g/kWh, else 100.
func TestPilotStartsWithTheSchedule(t *testing.T) {
	s := pilotScene(pilot(k6, 5, 800.0001), "1 t")
	s.policy = edit(t, s.policy, "required = true\n", "required = true\nschedule = \"0 14 * * *\"\n")
	s.series = header + row(-60*24*60, 12*60, "100") + row(12*60, 22*60, "50") + row(22*60, 900*60, "100") // from 14:00 to midnight
	st := s.judge(t)
	r := st.Runs[len(st.Runs)-1]
	require.NotNil(t, r.ProjectedTotal)
	assert.InDelta(t, 85*50, grams(t, r.ProjectedTotal), 1, "nine hours from 14:00")
	assert.InDelta(t, 8500, grams(t, r.Total), 1e-3)
}
