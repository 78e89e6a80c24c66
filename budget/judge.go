package budget

import (
	"fmt"
	"slices"

	"github.com/bmatcuk/doublestar/v4"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/ledger"
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
	UnreadBase []finding.Finding // base files that could not be read at all
	Commits    *Commits          // nil where no repository is at hand
	Adoption   bool              // the target has no policy yet: this is the head's, and the gate is open
	Notes      []string          // what the reading of files has to say

	Books      *Books         // what the ledger tells; nil where none is kept
	Repository string         // in the ledger; empty: any
	MergeGroup bool           // the head is a merge group: like a pull request, it is not on the branch yet
	Tags       []*ledger.Mark // releases that tags tell of, where the ledger has no marks
	Past       bool           // a change of the past: jobs that it has no booked run of are not asked for one
}

// prospective tells whether the change is not on the branch yet.
func (c *Case) prospective() bool { return c.Pull > 0 || c.MergeGroup }

// brokenBase is a base record of which nothing is known; "" if all could be read.
func (c *Case) brokenBase() string {
	for _, f := range c.UnreadBase {
		return f.File
	}
	for _, part := range c.Base {
		if !part.Opened() {
			return part.File
		}
	}
	return ""
}

// Judge applies the policy to one change.
func (p *Policy) Judge(c Case) *Statement {
	p = p.only(c.Jobs)
	s := &Statement{Format: 1, Branch: c.Branch, Pull: c.Pull, BaseCommit: c.BaseCommit, HeadCommit: c.HeadCommit,
		Now: c.Now, PolicySource: c.PolicySource, Notes: slices.Clone(c.Notes), Changes: []Change{}, Rulings: []Ruling{}, Accounts: []AccountLine{}}
	j := judgement{policy: p, c: &c, s: s, standing: newStanding(p, &c)}
	j.sides()
	s.Changes = j.changes()
	s.adoption, s.warns = c.Adoption, p.Evidence.Unproven == "warn"
	if !p.applies(c.Branch) {
		s.unruled = true
		s.verdict()
		return s
	}
	j.evidence()
	j.budgets()
	j.regressions()
	j.remarks()
	s.verdict()
	return s
}

// sides makes the runs of both sides, given and booked, and examines them.
func (j *judgement) sides() {
	p, c, s := j.policy, j.c, j.s
	head, stray := p.runsOf(pool(c.Head, j.headParts()), c.Jobs)
	booked := j.baseParts(head)
	given, mixed := mixed(booked, c.Base)
	base, strayBase := p.runsOf(append(given, booked...), c.Jobs)
	s.note(mixed...)
	base, late := s.without(base, head)
	p.label(base, "base", j.standing)
	p.label(head, "head", j.standing)
	s.Runs = append(append([]*footprint.Run{}, base...), head...)
	head, notes := j.standing.touched(head)
	s.note(notes...)
	s.note(j.standing.noteBase(base)...)
	j.head, j.base, j.stray = head, base, stray
	p.examine(c, j.standing, head, slices.Concat(base, late)) // a copy starts when its original does
	for _, part := range strayBase {
		s.note(fmt.Sprintf("base record %s has no readable open line and is left out", part.File))
	}
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

// verdict draws the verdict from the rulings.
func (s *Statement) verdict() {
	slices.SortStableFunc(s.Rulings, func(a, b Ruling) int { return severity[a.State] - severity[b.State] })
	s.Gate = Open
	if n := s.count(); !s.adoption && (n[Over] > 0 || n[Unproven] > 0 && !s.warns) || s.broken {
		s.Gate = Closed
	}
	s.Reason = s.Sentence(func(text string) string { return text })
}
