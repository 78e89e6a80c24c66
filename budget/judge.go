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
	Branch       string   // of the push, or the target of a pull request
	Pull         int      // 0 if there is none
	Jobs         []string // globs of the jobs to judge; empty: all
	HeadCommit   string
	BaseCommit   string
	Now          unit.Instant
	PolicySource string

	Head, Base []*footprint.Part // weighed by the same policy
	Unread     []finding.Finding // head files that could not be read at all
	Commits    *Commits          // nil where no repository is at hand
	Adoption   bool              // the target has no policy yet: this is the head's, and the gate is open
	Notes      []string          // what the reading of files has to say
}

// Judge applies the policy to one change.
func (p *Policy) Judge(c Case) *Statement {
	p = p.only(c.Jobs)
	head, stray := p.runsOf(c.Head, c.Jobs)
	base, strayBase := p.runsOf(c.Base, c.Jobs)
	s := &Statement{Format: 1, Branch: c.Branch, Pull: c.Pull, BaseCommit: c.BaseCommit, HeadCommit: c.HeadCommit,
		Now: c.Now, PolicySource: c.PolicySource, Notes: slices.Clone(c.Notes), Changes: []Change{}, Rulings: []Ruling{}, Accounts: []AccountLine{}}
	base, late := s.without(base, head)
	j := judgement{policy: p, c: &c, s: s, standing: newStanding(p, &c), stray: stray}
	p.label(base, "base", j.standing)
	p.label(head, "head", j.standing)
	s.Runs = slices.Concat([]*footprint.Run{}, base, head)
	head, notes := j.standing.touched(head)
	s.note(notes...)
	s.note(j.standing.noteBase(base)...)
	j.head, j.base = head, base
	p.examine(&c, j.standing, head, slices.Concat(base, late)) // a copy starts when its original does
	for _, part := range strayBase {
		s.note(fmt.Sprintf("base record %s has no readable open line and is left out", part.File))
	}
	s.Changes = s.changes(base, head)
	s.adoption, s.warns = c.Adoption, p.Evidence.Unproven == "warn"
	if !p.applies(c.Branch) {
		s.unruled = true
		s.verdict()
		return s
	}
	j.evidence()
	j.budgets()
	j.notYet()
	s.verdict()
	return s
}

// only is the policy with the jobs that any of the globs match.
func (p *Policy) only(jobs []string) *Policy {
	if len(jobs) == 0 {
		return p
	}
	some := *p
	some.Jobs = slices.DeleteFunc(slices.Clone(p.Jobs), func(j *Job) bool { return !matchesAny(jobs, j.Name) })
	return &some
}

// runsOf combines the parts of the jobs that any of the globs match.
func (p *Policy) runsOf(parts []*footprint.Part, jobs []string) ([]*footprint.Run, []*footprint.Part) {
	if len(jobs) > 0 {
		parts = slices.DeleteFunc(slices.Clone(parts), func(part *footprint.Part) bool {
			return part.Opened() && !matchesAny(jobs, part.Open.Job)
		})
	}
	return p.Runs(parts)
}

func (s *Statement) note(notes ...string) { s.Notes = append(s.Notes, notes...) }

// label says which side the runs are of, and what their inputs are.
func (p *Policy) label(runs []*footprint.Run, side string, st *standing) {
	for _, r := range runs {
		r.Side, r.Inputs = side, st.of(r, p.job(r.Job, r.Stage))
	}
}

// without drops base runs that are head runs too, for no run counts twice, and
// those that did not start before the first head run, for they are no past.
// The late ones are given back: they still tell of copies.
func (s *Statement) without(base, head []*footprint.Run) (past, late []*footprint.Run) {
	for _, b := range base {
		switch both := slices.ContainsFunc(head, func(h *footprint.Run) bool { return h.Run == b.Run && h.Attempt == b.Attempt }); {
		case both:
			s.note(fmt.Sprintf("run %s is given as base and as head: it counts as head", b.Run))
		case len(head) > 0 && b.Start >= head[0].Start: // runs are in order of start
			s.note(fmt.Sprintf("base run %s did not start before the first head run and is left out", b.Run))
			late = append(late, b)
		default:
			past = append(past, b)
		}
	}
	return past, late
}

// applies tells whether any rule is about the branch.
func (p *Policy) applies(branch string) bool {
	return slices.ContainsFunc(p.Budgets, func(b *Budget) bool { return matches(b.Branch, branch) }) ||
		slices.ContainsFunc(p.Regressions, func(r *Regression) bool { return matches(r.Branch, branch) })
}

// matches tells whether a glob of the policy, which was checked, matches.
func matches(glob, name string) bool { return doublestar.MatchUnvalidated(glob, name) }

func matchesAny(globs []string, name string) bool {
	return slices.ContainsFunc(globs, func(g string) bool { return matches(g, name) })
}

// judgement is the state of judging one case.
type judgement struct {
	policy     *Policy
	c          *Case
	s          *Statement
	standing   *standing
	head, base []*footprint.Run // head runs of which something is asked
	stray      []*footprint.Part
}

func (j *judgement) rule(r Ruling) { j.s.Rulings = append(j.s.Rulings, r) }

// evidence rules on what was given: files, required jobs, runs.
func (j *judgement) evidence() {
	place := j.policy.Evidence.Place
	unproven := func(job, reason string, missing bool, at Place) {
		j.rule(Ruling{Kind: KindEvidence, Name: "evidence", Branch: j.c.Branch, Job: job, State: Unproven, Reason: reason, Missing: missing, PolicyLine: at.Line, PolicyFile: at.File})
	}
	for _, f := range j.c.Unread {
		unproven("", f.String(), false, place)
	}
	for _, part := range j.stray {
		unproven("", fmt.Sprintf("%s belongs to no run: %s", part.File, part.Findings.First()), false, place)
	}
	for _, job := range j.policy.Jobs {
		switch {
		case j.standing.unchanged(job):
			j.rule(Ruling{Kind: KindEvidence, Name: "evidence", Branch: j.c.Branch, Job: job.Name, State: Within, Reason: unchanged, PolicyLine: job.Line, PolicyFile: job.File})
		case job.Required && !j.satisfied(job):
			reason, missing := j.missing(job)
			unproven(job.Name, reason, missing, job.Place)
		}
	}
	if len(j.head) == 0 && len(j.s.Rulings) == 0 {
		unproven("", "there is no head run to judge", true, place)
	}
	for _, job := range j.jobsSeen() {
		j.rule(j.jobEvidence(job))
	}
}

// unchanged is the reason of rulings on jobs whose inputs are the merge base's.
const unchanged = "inputs unchanged"

func (j *judgement) satisfied(job *Job) bool {
	return slices.ContainsFunc(j.head, func(r *footprint.Run) bool { return job.covers(r) && r.Outcome.Evidence() })
}

// covers tells whether the run is one of the job.
func (j *Job) covers(r *footprint.Run) bool {
	return j.Name == r.Job && (j.Stage == "" || j.Stage == r.Stage)
}

// missing says why a required job is not satisfied, and whether a record that
// is still to come may be all that it lacks.
func (j *judgement) missing(job *Job) (reason string, missing bool) {
	for _, r := range j.head {
		if job.covers(r) {
			return fmt.Sprintf("job %s is required, and the outcome of its run %s is %s", job.Name, r.Run, r.Outcome), false
		}
	}
	return fmt.Sprintf("job %s is required, and there is no head run of it", job.Name), true
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
	r.State, r.Missing = Unproven, onlyMissing(doubts)
	var reasons []string
	for _, d := range doubts {
		if !slices.Contains(reasons, d.Reason) {
			reasons = append(reasons, d.Reason)
		}
	}
	r.Reason = strings.Join(reasons, "; ")
	if d := doubts[0]; d.Unit != "" && believable(&d.Observed) && believable(&d.Limit) {
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
		j.s.note(fmt.Sprintf("the waiver of %q (%s:%d) is not applied yet by this version", w.Rule, w.File, w.Line))
	}
	if j.policy.Evidence.SameInputs && j.c.HeadCommit == "" {
		j.s.note("whether head runs stand for the head commit (same_inputs) is not judged: no commit is given")
	}
}

// verdict draws the verdict from the rulings.
func (s *Statement) verdict() {
	slices.SortStableFunc(s.Rulings, func(a, b Ruling) int { return severity[a.State] - severity[b.State] })
	s.Gate = Open
	if n := s.count(); !s.adoption && (n[Over] > 0 || n[Unproven] > 0 && !s.warns) || s.broken {
		s.Gate = Closed
	}
	s.Reason = s.Sentence(func(text string) string { return text })
}
