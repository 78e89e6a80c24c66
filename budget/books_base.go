package budget

import (
	"fmt"
	"slices"

	"budgetcheck/budget/footprint"
)

// baseParts are the booked parts to compare with: of each job that has head
// runs the last base_runs runs on the branch before the first head run, those
// with the merge base's inputs first.
func (j *judgement) baseParts(head []*footprint.Run) []*footprint.Part {
	if j.c.Books == nil || len(head) == 0 {
		return nil
	}
	first := head[0].Start // runs are in order of start
	earlier := before(j.c.Books.account[j.c.Branch], first)
	isHead := map[*footprint.Part]bool{}
	for _, r := range head {
		for _, p := range r.Pieces {
			isHead[p] = true
		}
	}
	var parts []*footprint.Part
	for _, group := range byJob(head) {
		parts = append(parts, j.baseOf(group[0], earlier, isHead)...)
	}
	return parts
}

// baseOf chooses the base of one job and stage.
func (j *judgement) baseOf(r *footprint.Run, earlier []*footprint.Part, isHead map[*footprint.Part]bool) (parts []*footprint.Part) {
	type run struct {
		run     string
		attempt int
	}
	job, most := j.policy.job(r.Job, r.Stage), j.policy.baseRuns(j.c.Branch)
	var same, other []run
	pieces := map[run][]*footprint.Part{}
	for n := len(earlier) - 1; n >= 0 && len(same) < most; n-- {
		p := earlier[n]
		if p.Open.Job != r.Job || p.Open.Stage != r.Stage || isHead[p] || !p.Outcome.Evidence() || p.End > j.c.Now {
			continue
		}
		k := run{p.Open.Run, p.Open.Attempt}
		if len(pieces[k]) == 0 {
			if j.standing.ofBase(p, job) {
				same = append(same, k)
			} else {
				other = append(other, k)
			}
		}
		pieces[k] = append(pieces[k], p)
		if len(other) > farBack && len(same) == 0 {
			break
		}
	}
	if len(same) > 0 { // filled up with earlier ones, not with what came after them
		first := pieces[same[len(same)-1]][0].Open.At
		other = slices.DeleteFunc(other, func(k run) bool { return pieces[k][0].Open.At >= first })
	}
	for _, k := range append(same, other[:min(len(other), max(most-len(same), 0))]...) {
		parts = append(parts, pieces[k]...)
	}
	return parts
}

// farBack is how many runs with other inputs than the merge base's are passed
// over before those with its inputs are given up.
const farBack = 200

// defaultBaseRuns is how many base runs are compared with where no regression
// asks for a number.
const defaultBaseRuns = 10

// baseRuns is how many base runs the rules for the branch ask for.
func (p *Policy) baseRuns(branch string) int {
	most := 0
	for _, r := range p.Regressions {
		if matches(r.Branch, branch) {
			most = max(most, r.BaseRuns)
		}
	}
	if most == 0 {
		return defaultBaseRuns
	}
	return most
}

// mixed says which jobs have both booked and given base runs: then the given
// ones are left out, for the ledger's are what was charged.
func mixed(booked, given []*footprint.Part) (kept []*footprint.Part, notes []string) {
	jobs := map[[2]string]bool{}
	for _, p := range booked {
		jobs[[2]string{p.Open.Job, p.Open.Stage}] = true
	}
	told := map[string]bool{}
	for _, p := range given {
		k := [2]string{p.Open.Job, p.Open.Stage}
		if !p.Opened() || !jobs[k] {
			kept = append(kept, p)
			continue
		}
		if !told[p.Open.Job] {
			told[p.Open.Job] = true
			notes = append(notes, fmt.Sprintf("the ledger has base runs of job %s: those that are given are left out", p.Open.Job))
		}
	}
	return kept, notes
}
