package main

import (
	"fmt"
	"math/rand/v2"

	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// job is how a job goes: a start, rounds of work that each end in a check of
// the model, an end. Powers are those of one device.
type job struct {
	open    record.Open // what its records say; run, time and place come later
	unit    string
	planned float64
	rounds  int

	start, work, check, end                 unit.Duration
	startWatt, workWatt, checkWatt, endWatt float64
}

var retrain = job{
	open: record.Open{Job: "retrain-tide", Stage: "training", Attempt: 1, Machine: "quad", Site: "quay-north"},
	unit: "step", planned: 100_000, rounds: 40,
	start: 4 * unit.Minute, work: 216 * unit.Second, check: 26 * unit.Second, end: 2 * unit.Minute,
	startWatt: 118, workWatt: 338, checkWatt: 205, endWatt: 108,
}

var score = job{
	open: record.Open{Job: "score-tide", Stage: "evaluation", Attempt: 1, Machine: "quad", Site: "quay-south"},
	unit: "gauge-hour", planned: 17_280, rounds: 24, // 24 gauges, 30 days each
	start: 30 * unit.Second, work: 44 * unit.Second, check: 4 * unit.Second, end: 18 * unit.Second,
	startWatt: 112, workWatt: 232, checkWatt: 150, endWatt: 104,
}

// run is one run of a job, in one part on each of its seats.
type run struct {
	job
	rng      *rand.Rand
	at       unit.Instant
	seats    []seat
	longer   float64 // factor on the time of each round
	stronger float64 // factor on the power of each round
}

// seat is where a part of a run sits, and the file that it leaves.
type seat struct {
	file     string
	host     string
	reserved float64 // units; 0 for the whole machine
	meters   []string
	late     unit.Duration // opens so much after the run's start
	outage   outage
}

// outage is a time in which one meter is not read. None has the zero value.
type outage struct {
	meter    string
	from, to unit.Duration // since the run's start
}

// The same code does not take the same energy twice: time and power spread by
// 1.4 % each, energy by 2 %.
const spread = 0.014

// baseRuns are six nights of the target branch.
func baseRuns() []run {
	var runs []run
	for day := 4; day <= 9; day++ {
		night := fmt.Sprintf("2031-03-%02d", day)
		r := newRun(retrain, night)
		r.open.Branch, r.open.Commit = "main", mainBefore
		if day >= 7 {
			r.open.Commit = mainTip
		}
		r.at = instant(night + "T02:15:00Z").Add(unit.Duration(r.rng.IntN(90)) * unit.Second)
		r.longer = r.about(spread)
		r.stronger = r.about(spread)
		r.seats = []seat{{file: "base/" + night + ".ndjson.gz", host: "quay-n-01", meters: devices(4)}}
		runs = append(runs, r)
	}
	return runs
}

// Commits, as made up as the rest.
const (
	mainBefore = "5b1e0c7a94d2f36881ce4b05a7d9e2f0316c8d47"
	mainTip    = "c20d7f4e61b8a3950e7f12d4986abc53f7e01b29"
	headTip    = "9e47a1d35f0c6b82d4e8137ac59f20b6e1837d5c"
)

// headRuns are what the pull request leaves: the training on half of two
// machines, longer and stronger than before, with a meter that was not read
// for four minutes; and the scoring of the model that came out of it.
func headRuns() []run {
	train, rate := newRun(retrain, "2031-03-10"), newRun(score, "2031-03-10")
	for _, r := range []*run{&train, &rate} {
		r.open.Branch, r.open.Commit, r.open.Pull = "longer-lead", headTip, 214
	}
	train.at, train.longer, train.stronger = instant("2031-03-10T02:17:20Z"), 1.145, 1.03
	train.seats = []seat{
		{file: "head/retrain-tide-0.ndjson.zst", host: "quay-n-01", reserved: 2, meters: devices(2)},
		{file: "head/retrain-tide-1.ndjson.zst", host: "quay-n-02", reserved: 2, meters: devices(2), late: 7 * unit.Second,
			outage: outage{"gpu1", 82 * unit.Minute, 86 * unit.Minute}},
	}
	rate.at = instant("2031-03-10T05:43:50Z")
	rate.seats = []seat{{file: "head/score-tide.ndjson", host: "quay-s-01", reserved: 1, meters: devices(1)}}
	return []run{train, rate}
}

func newRun(j job, night string) run {
	r := run{job: j, longer: 1, stronger: 1}
	r.open.Run = j.open.Job + "-" + night
	r.rng = stream(r.open.Run)
	return r
}

// devices are the names of the first n meters of a machine.
func devices(n int) []string { return []string{"gpu0", "gpu1", "gpu2", "gpu3"}[:n] }
