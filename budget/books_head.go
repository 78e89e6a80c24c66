package budget

import (
	"cmp"
	"maps"
	"slices"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/unit"
)

// headParts are the booked parts that stand for the change. Of a branch they
// are its own of late, for it is judged by its last nights and not by its whole
// past; of a pull request, and where a branch has none, any on the head commit
// or with its inputs, whichever account they are charged to.
func (j *judgement) headParts() []*footprint.Part {
	c := j.c
	if c.Books == nil {
		return nil
	}
	h := heads{j: j, found: map[*footprint.Part]bool{}, jobs: map[*Job]bool{}}
	if !c.prospective() {
		h.take(c.Books.account[c.Branch], func(p *footprint.Part) bool { return h.recent(p) })
	}
	own := maps.Clone(h.jobs)
	others := func(p *footprint.Part) bool {
		return !own[j.policy.job(p.Open.Job, p.Open.Stage)] && p.Account != c.Branch
	}
	if c.prospective() {
		others = func(*footprint.Part) bool { return true }
	}
	if c.Pull > 0 {
		h.take(c.Books.account[ledger.PullAccount(c.Pull)], func(p *footprint.Part) bool { return c.HeadCommit != "" || h.recent(p) })
	}
	if !c.prospective() {
		h.newest(own)
	}
	if c.HeadCommit != "" {
		for _, commit := range j.standing.alike() {
			h.take(c.Books.commit[commit], others)
		}
		for _, job := range j.policy.Jobs {
			h.take(c.Books.inputs[j.standing.headInputs(job)], others)
		}
	}
	slices.SortStableFunc(h.parts, func(a, b *footprint.Part) int { return cmp.Compare(a.Open.At, b.Open.At) })
	return h.parts
}

// heads collects head parts, each once.
type heads struct {
	j     *judgement
	found map[*footprint.Part]bool
	jobs  map[*Job]bool
	parts []*footprint.Part
}

// recent tells whether a run of the branch is one of its last nights. Of the
// past, each day is judged by itself.
func (h *heads) recent(p *footprint.Part) bool {
	if h.j.c.Past {
		return p.End/unit.Instant(unit.Day) == h.j.c.Now/unit.Instant(unit.Day)
	}
	return h.j.c.Now.Sub(p.End) <= h.j.policy.Evidence.MaxAge
}

// newest takes the last run of each job that has none of late and whose inputs
// are the head's: what the same inputs gave does not age.
func (h *heads) newest(own map[*Job]bool) {
	c := h.j.c
	if c.HeadCommit == "" {
		return
	}
	last := map[*Job]string{}
	parts := before(c.Books.account[c.Branch], c.Now)
	for n := len(parts) - 1; n >= max(0, len(parts)-farBack); n-- {
		p := parts[n]
		job := h.j.policy.job(p.Open.Job, p.Open.Stage)
		if job == nil || own[job] || last[job] != "" && last[job] != p.Open.Run {
			continue
		}
		before := len(h.parts)
		h.take(parts[n:n+1], func(*footprint.Part) bool { return true })
		if len(h.parts) > before {
			last[job] = p.Open.Run
		}
	}
}

// take takes those of the parts, which are in order of start, that stand for
// the head commit and that the caller wants.
func (h *heads) take(list []*footprint.Part, wanted func(*footprint.Part) bool) {
	c := h.j.c
	for _, p := range before(list, c.Now) {
		job := h.j.policy.job(p.Open.Job, p.Open.Stage)
		switch {
		case h.found[p], p.End > c.Now, job == nil, len(c.Jobs) > 0 && !matchesAny(c.Jobs, p.Open.Job):
		case h.j.standing.unchanged(job), !wanted(p), c.HeadCommit != "" && !h.j.standing.boundPart(p, job):
		default:
			h.found[p], h.jobs[job] = true, true
			h.parts = append(h.parts, p)
		}
	}
}
