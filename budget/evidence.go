package budget

import (
	"fmt"
	"slices"
	"strings"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// skew is how far a job's clock may be ahead of the gate's (common practice,
// no source).
const skew = unit.Minute

// examine doubts what the policy does not accept of the head runs. Records are
// checked, not believed: they come from the code under review.
func (p *Policy) examine(c *Case, st *standing, head, base []*footprint.Run) {
	for _, r := range slices.Concat(head, base) {
		p.examineFacts(r, c.Now)
		p.examineRecord(r, c.Now)
	}
	for _, r := range head {
		p.examineHead(r, c.Now, st)
	}
	attempts(head)
	all := slices.Concat(head, base, p.around(c, head, base))
	copies(all)
	countedTwice(all)
	metersOfBase(head, base, c.brokenBase())
}

// around are the booked runs, of whatever account, that were going on while the
// head runs were, besides those that are examined anyway: a device or a record
// may not count twice in the books either.
func (p *Policy) around(c *Case, head, base []*footprint.Run) []*footprint.Run {
	if c.Books == nil || len(head) == 0 {
		return nil
	}
	known := map[partKey]bool{}
	for _, r := range slices.Concat(head, base) {
		for _, part := range r.Pieces {
			known[keyOf(part)] = true
		}
	}
	from, to := head[0].Start, head[0].End
	for _, r := range head {
		from, to = min(from, r.Start), max(to, r.End)
	}
	others := slices.DeleteFunc(c.Books.around(from, to), func(part *footprint.Part) bool { return known[keyOf(part)] || part.End > c.Now })
	runs, _ := p.Runs(others)
	return runs
}

// examineFacts checks job, stage, sites and machines against the policy.
func (p *Policy) examineFacts(r *footprint.Run, now unit.Instant) {
	j := p.job(r.Job, r.Stage)
	if j == nil {
		r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("the policy does not know job %s at stage %s; add a [[job]]", r.Job, or(r.Stage, "(none)"))})
	}
	for _, part := range r.Pieces {
		site, machine := part.Open.Site, part.Open.Machine
		if p.Sites[site] == nil {
			r.Doubt(unknownPlace(part, "site", site))
		} else if j != nil && len(j.Sites) > 0 && !slices.Contains(j.Sites, site) {
			r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("%s ran at site %s; the policy allows %s", part.File, site, strings.Join(j.Sites, ", "))})
		}
		if p.Machines[machine] == nil {
			r.Doubt(unknownPlace(part, "machine", machine))
		} else if j != nil && len(j.Machines) > 0 && !slices.Contains(j.Machines, machine) {
			r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("%s ran on machine %s; the policy allows %s", part.File, machine, strings.Join(j.Machines, ", "))})
		}
	}
	if j != nil {
		p.examineWork(r, j, now)
	}
}

func unknownPlace(part *footprint.Part, what, name string) footprint.Doubt {
	if name == "" {
		return footprint.Doubt{Reason: fmt.Sprintf("%s names no %s", part.File, what)}
	}
	return footprint.Doubt{Reason: fmt.Sprintf("%s %s of %s is not in the policy; add [%s.%s]", what, name, part.File, what, name)}
}

// examineWork finds pilots: runs that did less than they or the job plan.
func (p *Policy) examineWork(r *footprint.Run, j *Job, now unit.Instant) {
	if !r.Outcome.Evidence() || r.Outcome == record.Stopped {
		return
	}
	w := r.Work
	switch {
	case w == nil && j.Work == nil:
		r.Pilot = r.Outcome == record.Pilot
	case w == nil:
		r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("run %s has no work lines; job %s is %s", r.Run, j.Name, j.Work)})
		return
	case j.Work != nil && w.Unit != j.Work.Unit:
		r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("work of run %s is told in %s, that of job %s in %s", r.Run, w.Unit, j.Name, j.Work.Unit)})
		return
	default:
		planned := w.Planned
		if j.Work != nil {
			planned = max(planned, j.Work.Amount)
		}
		r.Pilot = planned > w.Done || r.Outcome == record.Pilot
	}
	switch {
	case !r.Pilot:
	case r.Work == nil || r.Work.Done == 0 || p.planned(r, j) <= r.Work.Done:
		r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("run %s is a pilot, and does not tell how much of its work it did; write work lines with done and planned", r.Run)})
	default:
		p.project(r, j, now)
	}
}

// examineRecord checks coverage, grade and times.
func (p *Policy) examineRecord(r *footprint.Run, now unit.Instant) {
	for _, d := range p.thin(r) {
		r.Doubt(d)
	}
	if ahead := r.End.Sub(now); ahead > skew {
		r.Doubt(footprint.Doubt{Refutes: true, Reason: fmt.Sprintf("run %s ends in the future, at %s", r.Run, r.End)})
	}
}

// thin are the doubts about coverage and grade.
func (p *Policy) thin(r *footprint.Run) (doubts []footprint.Doubt) {
	e := p.Evidence
	if r.Coverage != nil && *r.Coverage < e.MinCoverage {
		got, want := unit.Apart(*r.Coverage, e.MinCoverage)
		doubts = append(doubts, footprint.Doubt{Reason: fmt.Sprintf("coverage of run %s is %s, below %s", r.Run, got, want),
			Observed: float64(*r.Coverage), Limit: float64(e.MinCoverage), Unit: "share"})
	}
	if r.Grade != "" && r.Grade.Worse(e.MinGrade) {
		doubts = append(doubts, footprint.Doubt{Reason: fmt.Sprintf("run %s is of grade %s; the policy asks for %s or better", r.Run, r.Grade, e.MinGrade)})
	}
	return doubts
}

// examineHead checks what is asked of head runs only.
func (p *Policy) examineHead(r *footprint.Run, now unit.Instant, st *standing) {
	j := p.job(r.Job, r.Stage)
	if p.Evidence.SameInputs {
		st.examine(r, j)
	}
	if j != nil && st.bound(r, j) {
		return // what the same inputs gave does not age
	}
	if old := now.Sub(r.End); old > p.Evidence.MaxAge {
		got, want := unit.Apart(old, p.Evidence.MaxAge)
		r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("run %s ended %s ago, more than %s", r.Run, got, want),
			Observed: old.Seconds(), Limit: p.Evidence.MaxAge.Seconds(), Unit: "s"})
	}
}

// attempts doubts runs whose earlier attempts are not there: all attempts are
// charged, and none may be left out.
func attempts(head []*footprint.Run) {
	have := map[string][]int{}
	for _, r := range head {
		have[r.Run] = append(have[r.Run], r.Attempt)
	}
	for _, r := range head {
		upTo := 0
		for _, attempt := range have[r.Run] {
			if attempt <= r.Attempt {
				upTo++
			}
		}
		if upTo < r.Attempt {
			r.Doubt(footprint.Doubt{Missing: true, Reason: fmt.Sprintf("run %s is attempt %d, and an earlier attempt's record is not there; give it too", r.Run, r.Attempt),
				Observed: float64(upTo), Limit: float64(r.Attempt), Unit: "attempts"})
		}
	}
}

// copies doubts parts of different runs that have the same energy lines.
func copies(runs []*footprint.Run) {
	first := map[string]*footprint.Part{}
	of := map[string]*footprint.Run{}
	for _, r := range runs {
		for _, part := range r.Pieces {
			if len(part.Meters) == 0 {
				continue
			}
			if other := first[part.Digest]; other != nil {
				d := footprint.Doubt{Reason: fmt.Sprintf("%s and %s have the same energy lines under different names", other.File, part.File)}
				of[part.Digest].Doubt(d)
				if of[part.Digest] != r {
					r.Doubt(d)
				}
				continue
			}
			first[part.Digest], of[part.Digest] = part, r
		}
	}
}

// metersOfBase asks of head parts the meters that base runs of the same job
// and machine had, where the policy does not say how many there are: those of
// the same part, or of all parts where base runs were not cut like that. broken
// is a base record that cannot be read; what meters it had is not known.
func metersOfBase(head, base []*footprint.Run, broken string) {
	type key struct{ job, stage, machine, part string }
	const whole = "\x00" // no part is called so
	seen := map[key]map[string]bool{}
	for _, r := range base {
		for _, part := range r.Pieces {
			for _, name := range []string{part.Open.Part, whole} {
				note(seen, key{r.Job, r.Stage, part.Open.Machine, name}, part)
			}
		}
	}
	for _, r := range head {
		for _, part := range r.Pieces {
			if m := part.Facts.Machine; m != nil && m.Meters > 0 {
				continue
			}
			if broken != "" {
				r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("the meters of %s cannot be compared: base record %s cannot be read, and the machine declares no meters", part.File, broken)})
			}
			k := key{r.Job, r.Stage, part.Open.Machine, part.Open.Part}
			if seen[k] == nil {
				k.part = whole
			}
			if missing := lacking(part, seen[k]); len(missing) > 0 {
				r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("meter missing: %s has no %s, which base runs have", part.File, strings.Join(missing, ", "))})
			}
		}
	}
}

func note[K comparable](seen map[K]map[string]bool, k K, part *footprint.Part) {
	if seen[k] == nil {
		seen[k] = map[string]bool{}
	}
	if part.Averaged { // a total is of no meter
		return
	}
	for _, m := range part.Meters {
		seen[k][m.Name] = true
	}
}

// lacking are the meters that the part does not have.
func lacking(part *footprint.Part, wanted map[string]bool) []string {
	return slices.DeleteFunc(names(wanted), func(name string) bool {
		return !part.Averaged && slices.ContainsFunc(part.Meters, func(m footprint.Meter) bool { return m.Name == name })
	})
}
