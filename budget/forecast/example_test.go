package forecast_test

import (
	"fmt"
	"time"

	"budgetcheck/budget/forecast"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// A nightly job, landed on the morning of March 21 with one night missing.
func Example() {
	now := unit.At(time.Date(2031, 3, 21, 6, 0, 0, 0, time.UTC))
	month, err := forecast.Holding("month", now, time.UTC)
	if err != nil {
		fmt.Println(err)
		return
	}
	schedule, err := forecast.ParseSchedule("15 2 * * *")
	if err != nil {
		fmt.Println(err)
		return
	}
	firings, err := schedule.Firings(month.From, month.To)
	if err != nil {
		fmt.Println(err)
		return
	}

	var steps []grid.Interval // 400 g/kWh, every fifth night 500
	for d := range 364 {
		from := month.From.Add(unit.Duration(d-344) * unit.Day)
		i := unit.Intensity(400)
		if d%5 == 0 {
			i = 500
		}
		steps = append(steps, grid.Interval{From: from, To: from.Add(unit.Day), I: i})
	}
	var runs []forecast.Run
	var starts []unit.Instant
	var spent unit.Mass
	for n, at := range firings[:20] { // the run of the 21st is not booked yet
		e := unit.Energy(3 + 0.1*float64(n%3))
		m := steps[344+n].I.Of(e)
		runs = append(runs, forecast.Run{Start: at, End: at.Add(unit.Hour), Facility: e, Total: m})
		starts = append(starts, at)
		spent += m
	}

	l := forecast.LandMass(forecast.Budget[unit.Mass]{
		Period: month, Now: now, Spent: spent, Limit: 40_000,
		Jobs: []forecast.Job{{
			Name: "retrain-tide", Past: runs, Left: forecast.Left(firings, starts, now, nil),
			Series: grid.NewSeries("NORTH", grid.Average, grid.Direct, steps),
		}},
	})
	fmt.Println(l.Period.Name, "spent", l.Spent, "runs left", l.RunsLeft)
	fmt.Println("lands at", *l.Expected, "from", *l.Low, "to", *l.High)
	fmt.Println("the limit of", l.Limit, "runs out on", *l.RunsOutOn)
	// Output:
	// 2031-03 spent 26.0 kg runs left 11
	// lands at 40.3 kg from 39.8 kg to 40.7 kg
	// the limit of 40.0 kg runs out on 2031-03-31T02:15:00Z
}
