package budget_test

import (
	"fmt"
	"slices"
	"strings"

	"pgregory.net/rapid"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// drawn is a case with one run of each of a few jobs, all of them required.
// Limits lie around what the runs came to, and records have had accidents.
//
// Left out are accidents of two records that contradict each other: one part
// with two contents, a copy, one device in two runs, parts that do not agree
// how many they are. Whoever removes one of the two removes the contradiction,
// and only books that are kept outside the change can tell. So it is with a
// later attempt after one that ended well, and with totals beside readings.
type drawn struct {
	policy, series string
	records        []sketch
	jobs           []drawnJob
}

type drawnJob struct {
	name, stage string
	work        bool // the policy declares how much
	limit       string
}

// accidents befall one record.
var accidents = map[string]func(*sketch){
	"a bad line":        func(s *sketch) { s.lines = append(s.lines, `{"k":"power","meter":"gpu0","w":-1}`) },
	"no open line":      func(s *sketch) { s.open.Job = "" },
	"no record":         func(s *sketch) { s.raw = "<html>\n" },
	"killed":            func(s *sketch) { s.outcome = "" },
	"failed":            func(s *sketch) { s.outcome = record.Failed },
	"stopped":           func(s *sketch) { s.outcome = record.Stopped },
	"a long hole":       func(s *sketch) { s.hole = [2]unit.Duration{5 * unit.Minute, 25 * unit.Minute} },
	"a dead meter":      func(s *sketch) { s.watts[0] = 0 },
	"a meter not there": func(s *sketch) { s.meters, s.watts = s.meters[1:], s.watts[1:] },
	"too hot":           func(s *sketch) { s.watts[0] = 5000 },
	"too cold":          func(s *sketch) { scaled(0.01)(s) },
	"unknown site":      func(s *sketch) { s.open.Site = "quay-east" },
	"no site":           func(s *sketch) { s.open.Site = "" },
	"unknown machine":   func(s *sketch) { s.open.Machine = "octo" },
	"the other site":    func(s *sketch) { s.open.Site = "quay-south" },
	"too many units":    func(s *sketch) { s.open.Reserved = 5 },
	"too late":          func(s *sketch) { s.open.At = now },
	"too early":         func(s *sketch) { s.open.At = two.Add(-80 * unit.Hour) },
	"no work":           func(s *sketch) { s.work = nil },
	"other work":        func(s *sketch) { s.work = []record.Work{{Unit: "epoch", Done: 3}} },
	"a pilot":           func(s *sketch) { s.work = []record.Work{{Unit: "step", Done: 100, Planned: 5000}} },
	"a total only": func(s *sketch) {
		s.used = []record.Used{{From: s.open.At, To: s.open.At.Add(s.length), Energy: unit.Energy(s.watts[0] / 500), Measured: true}}
		s.meters, s.watts = nil, nil
	},
	"counted": func(s *sketch) { s.counter = true },
}

var skies = map[string]string{
	"steady":  steady,
	"a hole":  header + row(-600, 5, "100") + row(15, 900, "100"),
	"ends":    header + row(-9*24*60, 15, "100"),
	"none":    header + strings.ReplaceAll(row(-600, 900, "100"), "NORTH", "EAST"),
	"broken":  header + row(-600, 900, "100") + "NORTH,,,3,average\n",
	"changes": header + row(-6000, 10, "50") + row(10, 900, "150"),
}

func keysOf[V any](m map[string]V) *rapid.Generator[string] {
	var keys []string
	for k := range m {
		keys = append(keys, k)
	}
	slices.Sort(keys)
	return rapid.SampledFrom(keys)
}

func drawCase(t *rapid.T) drawn {
	d := drawn{series: skies[keysOf(skies).Draw(t, "sky")]}
	for n := range rapid.IntRange(1, 2).Draw(t, "jobs") {
		j := drawnJob{name: fmt.Sprintf("job-%d", n), stage: rapid.SampledFrom([]string{"", "training"}).Draw(t, "stage"),
			work: rapid.Bool().Draw(t, "work"), limit: "1 kg"}
		d.jobs = append(d.jobs, j)
		d.drawRun(t, j)
	}
	d.policy = d.text(rapid.SampledFrom([]string{"simple", "guarded"}).Draw(t, "decision"), rapid.SampledFrom([]string{"close", "close", "warn"}).Draw(t, "unproven"))
	d.drawLimits(t)
	return d
}

// drawRun draws the attempts of a job's run: all but the last ended badly.
func (d *drawn) drawRun(t *rapid.T, j drawnJob) {
	attempts, parts := rapid.IntRange(1, 2).Draw(t, "attempts"), rapid.IntRange(1, 2).Draw(t, "parts")
	reserved := rapid.SampledFrom([]float64{0, 1, 2}).Draw(t, "reserved")
	for a := 1; a <= attempts; a++ {
		for part := range parts {
			s := night(called(fmt.Sprintf("%s-%d-%d.ndjson", j.name, a, part), "run-"+j.name), later(unit.Duration(a)*unit.Hour))
			s.open.Job, s.open.Stage, s.open.Attempt, s.open.Part, s.open.Parts = j.name, "training", a, fmt.Sprint(part), parts
			s.open.Host, s.open.Reserved = s.file, reserved
			s.length, s.every = 30*unit.Minute, 5*unit.Minute
			if reserved > 0 {
				meters(int(reserved))(&s)
			}
			s.watts = slices.Clone(s.watts)
			s.watts[0] += float64(rapid.IntRange(0, 50).Draw(t, "watts")) + float64(len(d.records))/100 // no two read the same
			s.work[0].OfPart = parts > 1
			if a < attempts {
				s.outcome = rapid.SampledFrom([]record.Outcome{record.Failed, record.Cancelled, ""}).Draw(t, "outcome")
			}
			if rapid.IntRange(0, 2).Draw(t, "accident?") == 0 {
				name := keysOf(accidents).Draw(t, "accident")
				if accidents[name](&s); a < attempts && s.outcome == record.Stopped {
					s.outcome = record.Failed
				}
			}
			d.records = append(d.records, s)
		}
	}
}

func (d *drawn) text(decision, unproven string) string {
	var b strings.Builder
	fmt.Fprintf(&b, "format = 1\n[account]\ndecision = %q\nuncertainty = { meter = \"2%%\", pue = \"3%%\", intensity = \"8%%\" }\n", decision)
	fmt.Fprintf(&b, "[evidence]\nunproven = %q\nmax_gap = \"5m\"\nmax_age = \"48h\"\n", unproven)
	b.WriteString("[site.quay-north]\nzone = \"NORTH\"\npue = 1.2\n[site.quay-south]\nzone = \"SOUTH\"\n" +
		"[machine.quad]\nunits = 4\nmeters = 4\nmeasured_share = 0.75\nidle = \"300 W\"\nrated = \"3 kW\"\nembodied = \"1 t\"\nlifetime = \"4y\"\n")
	for _, j := range d.jobs {
		fmt.Fprintf(&b, "[[job]]\nname = %q\nrequired = true\nsites = [\"quay-north\"]\n", j.name)
		if j.stage != "" {
			fmt.Fprintf(&b, "stage = %q\n", j.stage)
		}
		if j.work {
			b.WriteString("work = \"1000 step\"\n")
		}
		fmt.Fprintf(&b, "[[budget]]\nname = %q\nbranch = \"main\"\njob = %q\nper = \"run\"\nwarn_at = 0.9\nlimit = \"limit of %s\"\n", "of "+j.name, j.name, j.name)
	}
	return b.String() + "[[budget]]\nname = \"of any\"\nper = \"run\"\nlimit = \"limit of any\"\n"
}

// drawLimits draws limits around what the runs come to.
func (d *drawn) drawLimits(t *rapid.T) {
	final, probe := d.policy, d.policy
	names := []string{"any"}
	for _, j := range d.jobs {
		names = append(names, j.name)
	}
	for _, name := range names {
		probe = strings.Replace(probe, `"limit of `+name+`"`, `"1 kg"`, 1)
	}
	p := policyOf(t, probe)
	runs, _ := p.Runs(d.weighAll(t, p))
	for _, name := range names {
		limit := rapid.SampledFrom([]string{"10 g", "1 kWh", "1 kg"}).Draw(t, "limit")
		if fit := slices.DeleteFunc(slices.Clone(runs), func(r *footprint.Run) bool { return name != "any" && r.Job != name || r.Total == nil }); len(fit) > 0 {
			limit = limitNear(t, rapid.SampledFrom(fit).Draw(t, "run"))
		}
		final = strings.Replace(final, `"limit of `+name+`"`, `"`+limit+`"`, 1)
	}
	d.policy = final
}

func limitNear(t *rapid.T, r *footprint.Run) string {
	by := rapid.SampledFrom([]float64{0.2, 0.5, 0.8, 0.95, 0.999999, 1, 1.000001, 1.05, 1.2, 3}).Draw(t, "by")
	switch kind := rapid.IntRange(0, 2).Draw(t, "kind"); {
	case kind == 1:
		return exact(by*float64(*r.Facility), "kWh")
	case kind == 2 && r.Rate != nil:
		return exact(by*1000**r.Rate, "g per 1000 step")
	}
	return exact(by*float64(*r.Total), "g")
}

func (d *drawn) weighAll(t *rapid.T, p *budget.Policy) (parts []*footprint.Part) {
	set := seriesOf(t, d.series)
	for _, s := range d.records {
		parts = append(parts, weigh(t, p, set, s.file, s.text(t)))
	}
	return parts
}
