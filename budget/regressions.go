package budget

import (
	"fmt"
	"slices"

	"budgetcheck/budget/compare"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// regressions rules on every regression of the branch.
func (j *judgement) regressions() {
	for _, g := range j.policy.Regressions {
		if !matches(g.Branch, j.c.Branch) {
			continue
		}
		r, due := j.regression(g)
		if !due {
			continue
		}
		if w := j.waiver(g.Name, false); w != nil && r.State == Unproven {
			r.excuse(w, r.Reason)
		}
		j.rule(r)
	}
}

// ruling is an empty ruling of the regression.
func (g *Regression) ruling(branch string) Ruling {
	limit := float64(g.MaxRise)
	return Ruling{Kind: KindRegression, Name: g.Name, Branch: branch, Job: g.Job, Limit: &limit, Unit: "share",
		LimitText: unit.Signed(g.MaxRise), PolicyLine: g.Line, PolicyFile: g.File}
}

// covers tells whether the regression is about runs of a job and stage.
func (g *Regression) covers(job, stage string) bool {
	return matches(g.Job, job) && matches(g.Stage, stage)
}

// regression judges each job and stage; the worst is shown. They share the
// error of the rule. due is false where nothing is asked.
func (j *judgement) regression(g *Regression) (worst Ruling, due bool) {
	take := func(r Ruling) {
		if !due || r.worse(worst) {
			worst, due = r, true
		}
	}
	pairs := j.pairs(g)
	for _, p := range pairs {
		take(j.judgePair(g, p, len(pairs)))
	}
	for _, job := range j.policy.Jobs {
		if !matches(g.Job, job.Name) || job.Stage != "" && !matches(g.Stage, job.Stage) {
			continue
		}
		r := g.ruling(j.c.Branch)
		r.Job = job.Name
		switch {
		case j.standing.unchanged(job):
			r.State, r.Reason = Within, unchanged
			take(r)
		case j.asked(job) && !j.satisfied(job):
			r.State = Unproven
			r.Reason, r.Missing = j.missing(job)
			take(r)
		}
	}
	if len(pairs) > 1 && worst.Observed != nil {
		worst.Reason = joinReason(fmt.Sprintf("worst of %d jobs", len(pairs)), worst.Reason)
	}
	return worst, due
}

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

// judgePair compares one job and stage.
func (j *judgement) judgePair(g *Regression, p pair, shares int) Ruling {
	r := g.ruling(j.c.Branch)
	r.Job = p.job
	switch {
	case p.doubted != nil:
		r.State, r.Reason = Unproven, p.doubted.Reason
		r.Missing = p.doubted.Missing
		return r
	case g.Grid == "actual" && pricedDifferently(p):
		r.State, r.Reason = Unproven, "runs are priced by different sources, so that only grid = \"hold\" can compare them"
		return r
	case g.Against == "release" && j.c.Books == nil:
		r.State, r.Reason = Unproven, "no ledger is given, so the runs of the last release are not known; add -ledger"
		return r
	}
	out := compare.Compare(samples(p.base), samples(p.head), g.question(shares, j.shared(p)))
	r.State, r.Reason = State(out.State), out.Reason
	r.settleRatio(out)
	if out.Reason == "" {
		r.Reason = told(out)
	}
	return r
}

// question is what the regression asks of one pair.
func (g *Regression) question(shares int, shared float64) compare.Question {
	q := compare.Question{Measure: compare.Measure(g.Measure), Grid: compare.Grid(g.Grid), MaxRise: g.MaxRise,
		Confidence: defaultConfidence, Shares: shares, Shared: shared}
	if g.Confidence != nil {
		q.Confidence = *g.Confidence
	}
	return q
}

// defaultConfidence is that of each bound where a rule names none.
const defaultConfidence = unit.Share(0.95)

// settleRatio writes what was observed.
func (r *Ruling) settleRatio(out compare.Result) {
	r.Observed = out.Ratio
	if out.Confidence != nil {
		c := float64(*out.Confidence)
		r.Confidence = &c
	}
	if out.Ratio == nil {
		return
	}
	r.ObservedText = unit.Signed(unit.Share(*out.Ratio))
	if out.Low != nil && out.High != nil {
		r.IntervalText = fmt.Sprintf("%s (%s to %s)", r.ObservedText, unit.Signed(unit.Share(*out.Low)), unit.Signed(unit.Share(*out.High)))
	}
}

// told says in one sentence how much the comparison can tell.
func told(out compare.Result) string {
	text := fmt.Sprintf("from %d base and %d head runs", out.BaseRuns, out.HeadRuns)
	if out.Detectable != nil {
		text += fmt.Sprintf(", which would show a rise of %s", unit.Share(*out.Detectable))
	}
	if out.RunsNeeded > out.HeadRuns {
		text += fmt.Sprintf("; %d more head runs would settle it", out.RunsNeeded-out.HeadRuns)
	}
	return text
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
