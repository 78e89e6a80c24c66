package ledger

import (
	"cmp"
	"slices"

	"budgetcheck/budget/unit"
)

// Window is a span of time in an account.
type Window struct {
	Repository string // empty: any
	Account    string // empty: any
	From, To   unit.Instant
}

// Spending is what an account spent within a window, by job, stage, site, zone
// and machine, in order: whatever shares an input shares its error. Energy and
// operational emissions belong to the hours that they were used in, embodied
// emissions to the time that the machine was held.
type Spending struct {
	Lines []Spent
}

// Spent is one job and stage within a window, at one site and machine.
type Spent struct {
	Group

	Runs        int // attempts of runs that were going on within the window
	Facility    unit.Energy
	Operational unit.Mass
	Embodied    unit.Mass
	// In doubt are the runs whose total is not known, against whose record
	// something speaks, or of which parts are not booked; their names in order.
	// Their known energy and emissions are in the sums all the same.
	InDoubt []string
	// Proven is a lower bound of what the parts in doubt spent, of those that
	// lie within the window wholly.
	ProvenKWh unit.Energy
	ProvenG   unit.Mass
	// Sure is what the other parts spent.
	SureKWh unit.Energy
	SureG   unit.Mass
}

// Group is what the parts of one line of a Spending have in common.
type Group struct{ Job, Stage, Site, Zone, Machine string }

// group is the entry's.
func (e *Entry) group() Group { return Group{e.Job, e.Stage, e.Site, e.Zone, e.Machine} }

// Total is operational and embodied emissions.
func (s Spent) Total() unit.Mass { return s.Operational + s.Embodied }

func (s Spent) compare(o Spent) int {
	return cmp.Or(cmp.Compare(s.Job, o.Job), cmp.Compare(s.Stage, o.Stage), cmp.Compare(s.Site, o.Site),
		cmp.Compare(s.Zone, o.Zone), cmp.Compare(s.Machine, o.Machine))
}

// Spent adds up a window. Books must reach back to its start.
func (b *Books) Spent(w Window) Spending {
	if s, ok := b.Added[w]; ok {
		return s
	}
	sums := map[Group]*adding{}
	for _, e := range b.within(w) {
		if !w.keeps(e) {
			continue
		}
		k := e.group()
		if sums[k] == nil {
			sums[k] = &adding{Spent: Spent{Group: k}, runs: map[attempt]bool{}}
		}
		sums[k].add(e, w, b.parts[e.attempt()] < e.Of)
	}
	var s Spending
	for _, a := range sums {
		s.Lines = append(s.Lines, a.spent())
	}
	slices.SortFunc(s.Lines, Spent.compare)
	return s
}

func (w *Window) keeps(e *Entry) bool {
	return (w.Repository == "" || e.Repository == "" || w.Repository == e.Repository) && (w.Account == "" || w.Account == e.Account) &&
		e.Start < w.To && (e.End > w.From || e.Start >= w.From)
}

// attempt names a run: all its parts share it.
type attempt struct {
	repository, run string
	n               int
}

func (e *Entry) attempt() attempt { return attempt{e.Repository, e.Run.Run, e.Attempt} }

// adding is a line while it is added up.
type adding struct {
	Spent
	runs                                 map[attempt]bool // true: in doubt
	facility, sureKWh, provenKWh         unit.Sum[unit.Energy]
	operational, embodied, sureG, proveG unit.Sum[unit.Mass]
}

// add takes an entry; incomplete tells that parts of its run are not booked.
func (a *adding) add(e *Entry, w Window, incomplete bool) {
	s := e.Within(w.From, w.To)
	a.facility.Add(s.Facility)
	a.operational.Add(s.Operational)
	a.embodied.Add(s.Embodied)
	k := e.attempt()
	doubted := !s.Known || len(e.Reasons) > 0
	a.runs[k] = a.runs[k] || doubted || incomplete
	switch inside := e.Start >= w.From && e.End <= w.To; {
	case !doubted:
		a.sureKWh.Add(s.Facility)
		a.sureG.Add(s.Operational + s.Embodied)
	case inside && !e.refuted():
		a.provenKWh.Add(e.ProvenKWh)
		a.proveG.Add(e.ProvenG + s.Embodied)
	}
}

// refuted tells whether the measured energy itself is in question.
func (e *Entry) refuted() bool {
	for _, d := range e.Reasons {
		if d.Refutes {
			return true
		}
	}
	return false
}

func (a *adding) spent() Spent {
	s := a.Spent
	s.Runs = len(a.runs)
	s.Facility, s.Operational, s.Embodied = a.facility.Value(), a.operational.Value(), a.embodied.Value()
	s.SureKWh, s.SureG, s.ProvenKWh, s.ProvenG = a.sureKWh.Value(), a.sureG.Value(), a.provenKWh.Value(), a.proveG.Value()
	for k, doubted := range a.runs {
		if doubted {
			s.InDoubt = append(s.InDoubt, k.run)
		}
	}
	slices.Sort(s.InDoubt)
	s.InDoubt = slices.Compact(s.InDoubt)
	return s
}
