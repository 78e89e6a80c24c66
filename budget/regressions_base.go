package budget

import (
	"fmt"
	"slices"

	"budgetcheck/budget/footprint"
)

// pair is one job and stage on both sides.
type pair struct {
	job, stage string
	base, head []*footprint.Run
	doubted    *footprint.Doubt // against a head run, where there is one
}

// pairs are the jobs and stages with head runs that the regression is about.
func (j *judgement) pairs(g *Regression) (pairs []pair) {
	for _, group := range byJob(j.head) {
		first := group[0]
		if !g.covers(first.Job, first.Stage) {
			continue
		}
		p := pair{job: first.Job, stage: first.Stage}
		for _, r := range group {
			switch {
			case !r.Outcome.Evidence():
			case len(r.Doubts) > 0 && p.doubted == nil:
				p.doubted = &r.Doubts[0]
			case r.Whole() != nil:
				p.head = append(p.head, r)
			}
		}
		p.base = j.baseFor(g, p.job, p.stage)
		pairs = append(pairs, p)
	}
	return pairs
}

// baseFor is what the regression compares with: the last base_runs runs on the
// branch, or those before the last release, so that small rises do not add up
// unseen.
func (j *judgement) baseFor(g *Regression, job, stage string) (base []*footprint.Run) {
	from := j.base
	if g.Against == "release" {
		from = j.ofRelease(job, stage)
	}
	for _, r := range from {
		if r.Job == job && r.Stage == stage && noEvidence(r) == "" {
			base = append(base, r)
		}
	}
	return base[max(0, len(base)-g.BaseRuns):]
}

// ofRelease are the last runs of a job on the branch before its last release
// and before the first head run, examined.
func (j *judgement) ofRelease(job, stage string) (runs []*footprint.Run) {
	if j.c.Books == nil || len(j.head) == 0 {
		return nil
	}
	first := j.head[0].Start
	mark := j.lastRelease(j.c.Now)
	if mark == nil {
		return nil
	}
	until := min(mark.At, first)
	most, found := j.policy.baseRuns(j.c.Branch), map[[2]any]bool{}
	var parts []*footprint.Part
	earlier := before(j.c.Books.account[j.c.Branch], until)
	for n := len(earlier) - 1; n >= 0; n-- {
		p := earlier[n]
		if p.Open.Job != job || p.Open.Stage != stage || p.End > mark.At {
			continue
		}
		k := [2]any{p.Open.Run, p.Open.Attempt}
		if !found[k] && len(found) == 2*most { // some may be no evidence
			break
		}
		found[k] = true
		parts = append(parts, p)
	}
	runs, _ = j.policy.Runs(parts)
	for _, r := range runs {
		j.policy.examineFacts(r, j.c.Now)
		j.policy.examineRecord(r, j.c.Now)
	}
	return runs
}

// noEvidence tells why a run is no evidence in a comparison; "" if it is.
func noEvidence(r *footprint.Run) string {
	switch {
	case !r.Outcome.Evidence():
		return fmt.Sprintf("its outcome is %s", r.Outcome)
	case len(r.Doubts) > 0:
		return r.Doubts[0].Reason
	case r.Whole() == nil:
		return "its total is not known"
	}
	return ""
}

// pricedDifferently tells whether the runs' prices come from different sources.
func pricedDifferently(p pair) bool {
	kind := func(r *footprint.Run) [3]bool {
		if r.Priced == nil {
			return [3]bool{}
		}
		return [3]bool{r.Priced.Series > 0, r.Priced.Expected > 0, r.Priced.Annual > 0}
	}
	all := slices.Concat(p.base, p.head)
	return len(all) > 0 && slices.ContainsFunc(all, func(r *footprint.Run) bool { return kind(r) != kind(all[0]) })
}

// shared is the standard uncertainty of ln(head/base), with the grid held, that
// comes from inputs which runs share: each input scales a share of either side,
// and only the difference of the two shares is uncertain. Intensity and PUE are
// the base's on both sides.
func (j *judgement) shared(p pair) float64 {
	if len(p.base) == 0 || len(p.head) == 0 {
		return 0
	}
	var machine, operational float64
	for _, r := range p.base {
		w := r.Whole()
		machine += float64(w.Machine)
		operational += float64(w.Operational)
	}
	if machine == 0 {
		return 0
	}
	perMachine := operational / machine
	terms := heldTerms(p.head, perMachine).Plus(-1, heldTerms(p.base, perMachine))
	u, _ := terms.U(j.declared())
	return u
}

// heldTerms are the shares of a side's held total that scale with each input.
func heldTerms(runs []*footprint.Run, perMachine float64) footprint.Terms {
	by := map[footprint.Input]float64{}
	var total float64
	for _, r := range runs {
		w := r.Whole()
		held := perMachine * float64(w.Machine)
		total += held + float64(w.Embodied)
		machine := r.Pieces[0].Open.Machine
		by[footprint.Input{Kind: footprint.InputMeter, Name: machine}] += held
		by[footprint.Input{Kind: footprint.InputShare, Name: machine}] += held
		by[footprint.Input{Kind: footprint.InputPUE}] += held
		by[footprint.Input{Kind: footprint.InputIntensity}] += held
		by[footprint.Input{Kind: footprint.InputEmbodied, Name: machine}] += float64(w.Embodied)
	}
	if total == 0 {
		return footprint.Terms{}
	}
	return footprint.Terms{}.Plus(1/total, footprint.Terms{By: by})
}
