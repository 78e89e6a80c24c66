package main

import (
	"errors"
	"os"

	"budgetcheck/budget"
	"budgetcheck/report"
)

// weigh prints the footprint of records. It judges nothing; lines that cannot
// count and figures that cannot be known make it exit 1.
func weigh(args []string, s streams) (int, error) {
	var o options
	if err := o.parse("weigh", args, s, "policy", "head", "grid", "json"); err != nil {
		return 0, err
	}
	o.head = append(o.head, o.rest...)
	if len(o.head) == 0 {
		return 0, errors.New("no record is named; give files, or globs with -head")
	}
	l := &loader{policy: budget.Bare()}
	if _, err := os.Stat(policyName); err == nil || len(o.policy) > 0 {
		if l.policy, err = o.mustPolicy(); err != nil {
			return 0, err
		}
	}
	if err := l.readSeries(&o); err != nil {
		return 0, err
	}
	parts := l.weighAll(o.head, "-head", nil)
	wrong := tellFindings(s.err, l, parts)
	runs, stray := l.policy.Runs(parts)
	for _, r := range runs {
		wrong = wrong || len(r.Doubts) > 0
		for _, d := range r.Doubts {
			r.Notes = append(r.Notes, "unproven: "+d.Reason)
		}
		r.Doubts = nil // told as notes, in JSON too
	}
	if len(runs) == 0 || len(stray) > 0 {
		wrong = true
	}
	status := exitDone
	if wrong {
		status = exitFinding
	}
	if o.json {
		tellNotes(s.err, l.notes)
		return status, report.RunsJSON(s.out, runs)
	}
	return status, report.Runs(s.out, runs, l.notes)
}
