package main

import (
	"errors"
	"os"
	"slices"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
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
	parts, err := l.weighAll(o.head, "records", nil)
	if err != nil {
		return 0, err
	}
	status := exitDone
	runs, stray := l.policy.Runs(parts)
	doubted := slices.ContainsFunc(runs, func(r *footprint.Run) bool { return len(r.Doubts) > 0 })
	wrong := tellFindings(s.err, l, parts)
	if tell(s.err, l.missing...); wrong || doubted || len(stray)+len(l.missing) > 0 {
		status = exitFinding
	}
	if o.json {
		tell(s.err, l.notes...)
		return status, report.RunsJSON(s.out, runs)
	}
	return status, report.Runs(s.out, runs, l.notes)
}
