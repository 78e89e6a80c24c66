package budget

import (
	"cmp"
	"fmt"
	"maps"
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
		p.examineFacts(r)
		p.examineRecord(r, c.Now)
	}
	for _, r := range head {
		p.examineHead(r, c.Now, st)
	}
	attempts(head)
	copies(slices.Concat(head, base))
	countedTwice(slices.Concat(head, base))
	metersOfBase(head, base)
}

// examineFacts checks job, stage, sites and machines against the policy.
func (p *Policy) examineFacts(r *footprint.Run) {
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
		examineWork(r, j)
	}
}

func unknownPlace(part *footprint.Part, what, name string) footprint.Doubt {
	if name == "" {
		return footprint.Doubt{Reason: fmt.Sprintf("%s names no %s", part.File, what)}
	}
	return footprint.Doubt{Reason: fmt.Sprintf("%s %s of %s is not in the policy; add [%s.%s]", what, name, part.File, what, name)}
}

// examineWork finds pilots: runs that did less than they or the job plan.
func examineWork(r *footprint.Run, j *Job) {
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
	if r.Pilot {
		r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("run %s is a pilot: what the whole run would emit is not judged yet", r.Run)})
	}
}

// examineRecord checks coverage, grade and times.
func (p *Policy) examineRecord(r *footprint.Run, now unit.Instant) {
	e := p.Evidence
	if r.Coverage != nil && *r.Coverage < e.MinCoverage {
		got, want := unit.Apart(*r.Coverage, e.MinCoverage)
		r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("coverage of run %s is %s, below %s", r.Run, got, want),
			Observed: float64(*r.Coverage), Limit: float64(e.MinCoverage), Unit: "share"})
	}
	if r.Grade != "" && r.Grade.Worse(e.MinGrade) {
		r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("run %s is of grade %s; the policy asks for %s or better", r.Run, r.Grade, e.MinGrade)})
	}
	if ahead := r.End.Sub(now); ahead > skew {
		r.Doubt(footprint.Doubt{Refutes: true, Reason: fmt.Sprintf("run %s ends in the future, at %s", r.Run, r.End)})
	}
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
				d := footprint.Doubt{Refutes: true, Reason: fmt.Sprintf("%s and %s have the same energy lines under different names", other.File, part.File)}
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
// and machine had, where the policy does not say how many there are.
func metersOfBase(head, base []*footprint.Run) {
	type key struct{ job, stage, machine string }
	seen := map[key]map[string]bool{}
	for _, r := range base {
		for _, part := range r.Pieces {
			k := key{r.Job, r.Stage, part.Open.Machine}
			if seen[k] == nil {
				seen[k] = map[string]bool{}
			}
			for _, m := range part.Meters {
				seen[k][m.Name] = true
			}
		}
	}
	for _, r := range head {
		for _, part := range r.Pieces {
			if m := part.Facts.Machine; m != nil && m.Meters > 0 || part.Averaged {
				continue
			}
			names := names(seen[key{r.Job, r.Stage, part.Open.Machine}])
			missing := slices.DeleteFunc(names, func(name string) bool {
				return name == "used" || slices.ContainsFunc(part.Meters, func(m footprint.Meter) bool { return m.Name == name })
			})
			if len(missing) > 0 {
				r.Doubt(footprint.Doubt{Reason: fmt.Sprintf("meter missing: %s has no %s, which base runs have", part.File, strings.Join(missing, ", "))})
			}
		}
	}
}

// use is a span in which a part holds a meter, or units, of a host.
type use struct {
	run      *footprint.Run
	part     *footprint.Part
	from, to unit.Instant
}

// countedTwice doubts runs that use one device at the same time, or together
// reserve more units of a host than it has. Parts without a host are passed
// over: their devices cannot be told apart.
func countedTwice(runs []*footprint.Run) {
	hosts := map[[2]string][]use{}
	for _, r := range runs {
		for _, part := range r.Pieces {
			if part.Open.Host != "" && part.End > part.Open.At {
				k := [2]string{part.Open.Site, part.Open.Host}
				hosts[k] = append(hosts[k], use{r, part, part.Open.At, part.End})
			}
		}
	}
	for _, k := range slices.SortedFunc(maps.Keys(hosts), func(a, b [2]string) int {
		return cmp.Or(cmp.Compare(a[0], b[0]), cmp.Compare(a[1], b[1]))
	}) {
		uses := hosts[k]
		slices.SortStableFunc(uses, func(a, b use) int { return cmp.Compare(a.from, b.from) })
		shareMeters(uses)
		shareUnits(k[1], uses)
	}
}

// shareMeters sweeps over time with the last use of each meter at hand. Totals
// are of no meter.
func shareMeters(uses []use) {
	last := map[string]use{}
	for _, u := range uses {
		if u.part.Averaged {
			continue
		}
		for _, m := range u.part.Meters {
			if before, ok := last[m.Name]; ok && u.from < before.to {
				doubtAll([]use{before, u}, fmt.Sprintf("counted twice: %s and %s both have meter %s of host %s from %s on",
					before.part.File, u.part.File, m.Name, u.part.Open.Host, u.from))
			}
			if u.to >= last[m.Name].to {
				last[m.Name] = u
			}
		}
	}
}

// shareUnits sweeps over time with the uses that are still going on.
func shareUnits(host string, uses []use) {
	var going []use
	for _, u := range uses {
		going = slices.DeleteFunc(going, func(g use) bool { return g.to <= u.from })
		going = append(going, u)
		m := u.part.Facts.Machine
		if m == nil || len(going) == 1 {
			continue
		}
		var units float64
		for _, g := range going {
			units += reservedUnits(g.part, m)
		}
		if units > m.Units*(1+1e-12) {
			doubtAll(going, fmt.Sprintf("counted twice: %v of the %v units of host %s are reserved at %s, by %s among others",
				units, m.Units, host, u.from, u.part.File))
		}
	}
}

func reservedUnits(part *footprint.Part, m *footprint.Machine) float64 {
	if part.Open.Reserved == 0 {
		return m.Units
	}
	return part.Open.Reserved
}

// doubtAll doubts each run of the uses once.
func doubtAll(uses []use, reason string) {
	var told []*footprint.Run
	for _, u := range uses {
		if !slices.Contains(told, u.run) {
			told = append(told, u.run)
			u.run.Doubt(footprint.Doubt{Reason: reason, Refutes: true})
		}
	}
}
