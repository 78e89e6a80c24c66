package budget_test

import (
	"fmt"
	"strings"
	"time"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// The pipeline once, from texts to the gate.
func Example() {
	policy, findings := budget.ParsePolicy(budget.PolicyFile{Name: "budgetcheck.toml", Data: []byte(`
format = 1

[evidence]
max_gap = "1h"

[site.quay-north]
zone = "NORTH"
pue = 1.2

[machine.quad]
measured_share = 0.75

[[job]]
name = "retrain-tide"
required = true

[[budget]]
name = "main, one training run"
branch = "main"
job = "retrain-tide"
limit = "450 g"
per = "run"
`)})
	if len(findings) > 0 {
		fmt.Println(findings)
		return
	}

	// Records, and the series that prices them: a meter reads 1 kW for an hour
	// while the grid goes from 200 to 400 g/kWh.
	source, err := record.NewReader(strings.NewReader(`
{"k":"open","format":1,"run":"n1","job":"retrain-tide","at":"2031-03-10T02:30:00Z","site":"quay-north","machine":"quad"}
{"k":"power","at":"2031-03-10T02:30:00Z","meter":"gpu0","w":1000}
{"k":"power","at":"2031-03-10T03:30:00Z","meter":"gpu0","w":1000}
{"k":"close","at":"2031-03-10T03:30:00Z","outcome":"ok"}
`), "night.ndjson")
	if err != nil {
		fmt.Println(err)
		return
	}
	file, err := grid.ReadCSV(strings.NewReader(`zone,from,to,g_per_kwh,factor
NORTH,2031-03-10T02:00:00Z,2031-03-10T03:00:00Z,200,average
NORTH,2031-03-10T03:00:00Z,2031-03-10T04:00:00Z,400,average
`), "north.csv", policy.Grid.ColumnNames())
	if err != nil {
		fmt.Println(err)
		return
	}

	// Weigh: machine 1 kWh / 0.75, facility 1.2 times that, half at each price.
	part, err := policy.Weigh(source, grid.NewSet(policy.Grid.Boundary, file))
	if err != nil {
		fmt.Println(err)
		return
	}

	// Runs, rulings, statement.
	statement := policy.Judge(budget.Case{
		Branch: "main", PolicySource: "budgetcheck.toml", Head: []*footprint.Part{part},
		Now: unit.At(time.Date(2031, 3, 10, 12, 0, 0, 0, time.UTC)),
	})
	run := statement.Runs[0]
	fmt.Println("run", run.Run, "took", *run.Facility, "at", *run.Intensity)
	for _, r := range statement.Rulings {
		fmt.Printf("%s ruling on line %d: %s\n", r.Kind, r.PolicyLine, r.State)
	}
	fmt.Printf("gate %s: %s\n", statement.Gate, statement.Reason)
	// Output:
	// run n1 took 1.60 kWh at 300 g/kWh
	// budget ruling on line 18: over
	// evidence ruling on line 4: within
	// gate closed: main, one training run is over by 30.0 g: 480 g of 450 g (of 2 rulings 1 over, 1 within)
}
