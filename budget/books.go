package budget

import (
	"cmp"
	"fmt"
	"maps"
	"slices"
	"sort"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/forecast"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/ledger"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// Books is what the ledger tells a judgement: the parts in the books, restated
// with the facts in force, the release marks, and what accounts spent.
type Books struct {
	ledger  *ledger.Books
	all     []*footprint.Part // in order of start
	account map[string][]*footprint.Part
	commit  map[string][]*footprint.Part
	inputs  map[string][]*footprint.Part
	key     map[partKey]*footprint.Part
	longest unit.Duration // of any part
	known   forecast.Known
}

// Books restates what was read of a ledger with the policy's facts. The series
// are for those entries that tell no zone.
func (p *Policy) Books(read *ledger.Books, set *grid.Set) *Books {
	b := &Books{ledger: read, account: map[string][]*footprint.Part{}, commit: map[string][]*footprint.Part{}, inputs: map[string][]*footprint.Part{},
		key: map[partKey]*footprint.Part{}}
	look := func(o *record.Open) footprint.Facts { return p.facts(o, set) }
	for _, e := range read.Entries {
		part := e.Restore(e.Key().String()+" of the books", p.Method(), look)
		part.Account, part.Inputs = e.Account, e.Inputs
		b.add(part)
	}
	return b
}

func (b *Books) add(part *footprint.Part) {
	b.all = append(b.all, part)
	b.key[keyOf(part)] = part
	b.account[part.Account] = append(b.account[part.Account], part)
	if c := part.Open.Commit; c != "" {
		b.commit[c] = append(b.commit[c], part)
	}
	if part.Inputs != "" {
		b.inputs[part.Inputs] = append(b.inputs[part.Inputs], part)
	}
	b.longest = max(b.longest, part.End.Sub(part.Open.At))
}

// before are those of the parts, which are in order of start, that started
// before t.
func before(parts []*footprint.Part, t unit.Instant) []*footprint.Part {
	return parts[:sort.Search(len(parts), func(n int) bool { return parts[n].Open.At >= t })]
}

// around are the parts of any account that were going on at some time between
// from and to.
func (b *Books) around(from, to unit.Instant) []*footprint.Part {
	first := sort.Search(len(b.all), func(n int) bool { return b.all[n].Open.At >= from.Add(-b.longest) })
	return slices.DeleteFunc(slices.Clone(before(b.all[first:], to)), func(p *footprint.Part) bool { return p.End <= from })
}

// partKey names a part of a run.
type partKey struct {
	run     string
	attempt int
	part    string
}

func keyOf(p *footprint.Part) partKey { return partKey{p.Open.Run, p.Open.Attempt, p.Open.Part} }

// pool adds booked parts to given ones. A part that is given and booked alike
// is one part.
func pool(given, booked []*footprint.Part) []*footprint.Part {
	have := map[partKey]*footprint.Part{}
	for _, p := range given {
		have[keyOf(p)] = p
	}
	all := slices.Clone(given)
	for _, p := range booked {
		if g := have[keyOf(p)]; g != nil && sameContent(g, p) {
			g.Account, g.Inputs = p.Account, p.Inputs
			continue
		}
		all = append(all, p)
	}
	return all
}

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
