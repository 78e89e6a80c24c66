package budget

import (
	"fmt"

	"budgetcheck/budget/compare"
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
func (j *judgement) regression(g *Regression) (r Ruling, due bool) {
	var w worst
	pairs := j.pairs(g)
	for _, p := range pairs {
		w.take(j.judgePair(g, p, len(pairs)))
	}
	j.owed(&w, g.Job, g.Stage, g.ruling(j.c.Branch))
	return w.of(len(pairs), "jobs")
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
