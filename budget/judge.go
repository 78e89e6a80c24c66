package budget

import (
	"fmt"
	"slices"
	"strings"

	"github.com/bmatcuk/doublestar/v4"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// Case is all that a judgement turns on besides the policy. Judge reads
// nothing else: no file, no network, no clock.
type Case struct {
	Branch       string // of the push, or the target of a pull request
	Pull         int    // 0 if there is none
	HeadCommit   string
	BaseCommit   string
	Now          unit.Instant
	PolicySource string

	Head, Base []*footprint.Part // weighed by the same policy
	Unread     []finding.Finding // head files that could not be read at all
	Notes      []string          // what the reading of files has to say
}

// Judge applies the policy to one change.
func (p *Policy) Judge(c Case) *Statement {
	head, stray := p.Runs(c.Head)
	base, strayBase := p.Runs(c.Base)
	s := &Statement{Format: 1, Branch: c.Branch, Pull: c.Pull, BaseCommit: c.BaseCommit, HeadCommit: c.HeadCommit,
		Now: c.Now, PolicySource: c.PolicySource, Notes: slices.Clone(c.Notes), Changes: []Change{}, Rulings: []Ruling{}, Accounts: []AccountLine{}}
	base = s.without(base, head)
	p.examine(&c, head, base)
	for _, r := range base {
		r.Side = "base"
	}
	for _, r := range head {
		r.Side = "head"
	}
	s.Runs = slices.Concat([]*footprint.Run{}, base, head)
	for _, part := range strayBase {
		s.Notes = append(s.Notes, fmt.Sprintf("base record %s has no readable open line and is left out", part.File))
	}
	s.Changes = s.changes(base, head)
	if !p.applies(c.Branch) {
		s.Gate, s.unruled = Open, true
		s.Reason = s.Sentence(func(text string) string { return text })
		return s
	}
	j := judgement{policy: p, c: &c, s: s, head: head, base: base, stray: stray}
	j.evidence()
	j.budgets()
	j.notYet()
	s.decide(p.Evidence.Unproven)
	return s
}

// without drops base runs that are head runs too: no run counts twice.
func (s *Statement) without(base, head []*footprint.Run) []*footprint.Run {
	return slices.DeleteFunc(base, func(b *footprint.Run) bool {
		both := slices.ContainsFunc(head, func(h *footprint.Run) bool { return h.Run == b.Run && h.Attempt == b.Attempt })
		if both {
			s.Notes = append(s.Notes, fmt.Sprintf("run %s is given as base and as head: it counts as head", b.Run))
		}
		return both
	})
}

// applies tells whether any rule is about the branch.
func (p *Policy) applies(branch string) bool {
	return slices.ContainsFunc(p.Budgets, func(b *Budget) bool { return matches(b.Branch, branch) }) ||
		slices.ContainsFunc(p.Regressions, func(r *Regression) bool { return matches(r.Branch, branch) })
}

// matches tells whether a glob of the policy, which was checked, matches.
func matches(glob, name string) bool { return doublestar.MatchUnvalidated(glob, name) }

// judgement is the state of judging one case.
type judgement struct {
	policy     *Policy
	c          *Case
	s          *Statement
	head, base []*footprint.Run
	stray      []*footprint.Part
}

func (j *judgement) rule(r Ruling) { j.s.Rulings = append(j.s.Rulings, r) }

// evidence rules on what was given: files, required jobs, runs.
func (j *judgement) evidence() {
	place := j.policy.Evidence.Place
	unproven := func(job, reason string, at Place) {
		j.rule(Ruling{Kind: KindEvidence, Name: "evidence", Branch: j.c.Branch, Job: job, State: Unproven, Reason: reason, PolicyLine: at.Line, PolicyFile: at.File})
	}
	for _, f := range j.c.Unread {
		unproven("", f.String(), place)
	}
	for _, part := range j.stray {
		unproven("", fmt.Sprintf("%s belongs to no run: %s", part.File, part.Findings.First()), place)
	}
	for _, job := range j.policy.Jobs {
		if job.Required && !j.satisfied(job) {
			unproven(job.Name, j.missing(job), job.Place)
		}
	}
	if len(j.head) == 0 && len(j.s.Rulings) == 0 {
		unproven("", "there is no head run to judge", place)
	}
	for _, job := range j.jobsSeen() {
		j.rule(j.jobEvidence(job))
	}
}

func (j *judgement) satisfied(job *Job) bool {
	return slices.ContainsFunc(j.head, func(r *footprint.Run) bool { return job.covers(r) && r.Outcome.Evidence() })
}

// covers tells whether the run is one of the job.
func (j *Job) covers(r *footprint.Run) bool {
	return j.Name == r.Job && (j.Stage == "" || j.Stage == r.Stage)
}

func (j *judgement) missing(job *Job) string {
	for _, r := range j.head {
		if job.covers(r) {
			return fmt.Sprintf("job %s is required, and its run %s %s", job.Name, r.Run, r.Outcome)
		}
	}
	return fmt.Sprintf("job %s is required, and there is no head run of it", job.Name)
}

// jobsSeen are the jobs of the head runs, in order of start.
func (j *judgement) jobsSeen() (jobs []string) {
	for _, r := range j.head {
		if !slices.Contains(jobs, r.Job) {
			jobs = append(jobs, r.Job)
		}
	}
	return jobs
}

// jobEvidence sums up the doubts about one job's head runs.
func (j *judgement) jobEvidence(job string) Ruling {
	place := j.policy.Evidence.Place
	r := Ruling{Kind: KindEvidence, Name: "evidence", Branch: j.c.Branch, Job: job, State: Within, PolicyLine: place.Line, PolicyFile: place.File}
	var doubts []footprint.Doubt
	for _, run := range j.head {
		if run.Job == job {
			doubts = append(doubts, run.Doubts...)
		}
	}
	if len(doubts) == 0 {
		return r
	}
	r.State = Unproven
	var reasons []string
	for _, d := range doubts {
		if !slices.Contains(reasons, d.Reason) {
			reasons = append(reasons, d.Reason)
		}
	}
	r.Reason = strings.Join(reasons, "; ")
	if d := doubts[0]; d.Unit != "" {
		r.Observed, r.Limit, r.Unit = &d.Observed, &d.Limit, d.Unit
	}
	return r
}

// notYet tells of rules that this version cannot judge. They are unproven, not
// passed over.
func (j *judgement) notYet() {
	for _, r := range j.policy.Regressions {
		if matches(r.Branch, j.c.Branch) {
			j.rule(Ruling{Kind: KindRegression, Name: r.Name, Branch: j.c.Branch, Job: r.Job, State: Unproven,
				Reason: "not judged yet: this version does not compare head with base statistically", PolicyLine: r.Line, PolicyFile: r.File})
		}
	}
	for _, w := range j.policy.Waivers {
		j.s.Notes = append(j.s.Notes, fmt.Sprintf("the waiver of %q (%s:%d) is not applied yet by this version", w.Rule, w.File, w.Line))
	}
	if j.policy.Evidence.SameInputs {
		j.s.Notes = append(j.s.Notes, "that head runs stand for the head commit (same_inputs) is not judged yet by this version")
	}
}

// decide draws the verdict from the rulings.
func (s *Statement) decide(unproven string) {
	slices.SortStableFunc(s.Rulings, func(a, b Ruling) int { return severity[a.State] - severity[b.State] })
	s.Gate = Open
	if n := s.count(); n[Over] > 0 || n[Unproven] > 0 && unproven == "close" {
		s.Gate = Closed
	}
	s.Reason = s.Sentence(func(text string) string { return text })
}
