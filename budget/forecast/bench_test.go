package forecast

import (
	"math/rand/v2"
	"testing"

	"budgetcheck/budget/unit"
)

// yearly is a budget of five jobs in one zone, with a year of an hourly series.
func yearly(b *testing.B, schedules ...string) Budget[unit.Mass] {
	p := march(b)
	r := rand.New(rand.NewPCG(1, 1))
	var values []float64
	for _, w := range weather(r, 365*24, 0.95) {
		values = append(values, 400+80*w)
	}
	zone := series(p.From.Add(-unit.Year), unit.Hour, values...)
	budget := Budget[unit.Mass]{Period: p, Now: p.From, Limit: 1e6}
	for _, text := range schedules {
		s, err := ParseSchedule(text)
		if err != nil {
			b.Fatal(err)
		}
		left, err := s.Firings(p.From, p.To)
		if err != nil {
			b.Fatal(err)
		}
		budget.Jobs = append(budget.Jobs, Job{Name: text, Past: past(p.From, 400, 57, alternating(30, 10, 0.5)...), Left: left, Series: zone})
	}
	return budget
}

func land5(b *testing.B, schedules ...string) {
	budget := yearly(b, schedules...)
	for b.Loop() {
		if l := LandMass(budget); l.Expected == nil || len(l.Notes) > 0 {
			b.Fatal(l.Notes)
		}
	}
}

func BenchmarkFiveNightlyJobs(b *testing.B) {
	land5(b, "15 2 * * *", "15 3 * * *", "15 4 * * *", "0 22 * * *", "30 12 * * *")
}

func BenchmarkFiveHourlyJobs(b *testing.B) {
	land5(b, "0 * * * *", "10 * * * *", "20 * * * *", "30 * * * *", "*/10 * * * *")
}

func BenchmarkBacktest(b *testing.B) {
	budget := yearly(b, "15 2 * * *")
	h := asOf(budget.Jobs[0].Series, budget.Now)
	e := budget.Jobs[0].estimate(budget.Period, budget.Now)
	slots := slots(e.firings, unit.Hour)
	for b.Loop() {
		if _, ok := h.backtest(slots); !ok {
			b.Fatal("no day was told")
		}
	}
}

func BenchmarkFiringsOfAMinutelyYear(b *testing.B) {
	s, err := ParseSchedule("* * * * *")
	if err != nil {
		b.Fatal(err)
	}
	from := march(b).From
	for b.Loop() {
		if all, err := s.Firings(from, from.Add(unit.Year)); err != nil || len(all) != 525_600 {
			b.Fatal(len(all), err)
		}
	}
}
