package ledger

import (
	"cmp"
	"slices"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// Window is a span of time in an account.
type Window struct {
	Repository string // empty: any
	Account    string // empty: any
	From, To   unit.Instant
	// Known leaves out entries of runs that ended after it, for they were not
	// booked by then; 0 leaves out none. A store that adds up by itself may
	// take all that it has: it is asked as of now.
	Known unit.Instant
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
	InDoubt    []string
	InDoubtKWh []string // those of them whose energy is in doubt too
	// Proven is a lower bound of what the parts in doubt spent, of those that
	// lie within the window wholly.
	ProvenKWh unit.Energy
	ProvenG   unit.Mass
	// Sure is what the other parts spent.
	SureKWh unit.Energy
	SureG   unit.Mass
}

// Group is what the parts of one line of a Spending have in common.
type Group struct {
	Job, Stage, Site, Zone, Machine string
	Factor                          grid.Factor
	Boundary                        grid.Boundary
}

// group is the entry's.
func (e *Entry) group() Group {
	return Group{e.Job, e.Stage, e.Site, e.Zone, e.Machine, e.Factor, e.Boundary}
}

// Total is operational and embodied emissions.
func (s Spent) Total() unit.Mass { return s.Operational + s.Embodied }

func (s Spent) compare(o Spent) int {
	return cmp.Or(cmp.Compare(s.Job, o.Job), cmp.Compare(s.Stage, o.Stage), cmp.Compare(s.Site, o.Site),
		cmp.Compare(s.Zone, o.Zone), cmp.Compare(s.Machine, o.Machine), cmp.Compare(s.Factor, o.Factor), cmp.Compare(s.Boundary, o.Boundary))
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
			sums[k] = &adding{Spent: Spent{Group: k}, runs: map[attempt]doubts{}}
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
		e.Start < w.To && (e.End > w.From || e.Start >= w.From) && (w.Known == 0 || e.End <= w.Known)
}

// doubts tell what of a run is in doubt.
type doubts struct{ mass, energy bool }

func (d doubts) or(o doubts) doubts { return doubts{d.mass || o.mass, d.energy || o.energy} }

func (d doubts) any() bool { return d.mass || d.energy }

// doubts are those about the entry. A price that is missing leaves its energy
// as certain as it was.
func (e *Entry) doubts() doubts {
	d := doubts{mass: e.Total == nil || len(e.Reasons) > 0 || e.Thin != "", energy: e.Facility == nil || e.Thin != ""}
	for _, r := range e.Reasons {
		d.energy = d.energy || !r.Price
	}
	return d
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
	runs                                 map[attempt]doubts
	facility, sureKWh, provenKWh         unit.Sum[unit.Energy]
	operational, embodied, sureG, proveG unit.Sum[unit.Mass]
}

// add takes an entry; incomplete tells that parts of its run are not booked.
func (a *adding) add(e *Entry, w Window, incomplete bool) {
	s := e.Within(w.From, w.To)
	a.facility.Add(s.Facility)
	a.operational.Add(s.Operational)
	a.embodied.Add(s.Embodied)
	k, d := e.attempt(), e.doubts()
	a.runs[k] = a.runs[k].or(d).or(doubts{incomplete, incomplete})
	a.sure(s, d)
	if e.Start >= w.From && e.End <= w.To {
		kwh, g := e.proven()
		a.provenKWh.Add(kwh)
		a.proveG.Add(g)
	}
}

// sure adds what is not in doubt.
func (a *adding) sure(s footprint.Slice, d doubts) {
	if !d.energy {
		a.sureKWh.Add(s.Facility)
	}
	if !d.mass {
		a.sureG.Add(s.Operational + s.Embodied)
	}
}

// Certain is what the entry is known to have spent within a span: what is not in
// doubt, and what of the rest is proven.
func (e *Entry) Certain(from, to unit.Instant) (kwh unit.Energy, g unit.Mass) {
	in, d := e.Within(from, to), e.doubts()
	if e.Start >= from && e.End <= to {
		kwh, g = e.proven()
	}
	if !d.energy {
		kwh += in.Facility
	}
	if !d.mass {
		g += in.Operational + in.Embodied
	}
	return kwh, g
}

// proven is what the entry proves to be spent of what is in doubt. Without the
// facts of its place that is nothing.
func (e *Entry) proven() (kwh unit.Energy, g unit.Mass) {
	d := e.doubts()
	if e.refuted() || e.Facility == nil {
		return 0, 0
	}
	if d.energy {
		kwh = e.ProvenKWh
	}
	if d.mass {
		g = e.ProvenG
		if e.Embodied != nil {
			g += *e.Embodied
		}
	}
	return kwh, g
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
	for k, d := range a.runs {
		if d.any() {
			s.InDoubt = append(s.InDoubt, k.run)
		}
		if d.energy {
			s.InDoubtKWh = append(s.InDoubtKWh, k.run)
		}
	}
	s.InDoubt, s.InDoubtKWh = once(s.InDoubt), once(s.InDoubtKWh)
	return s
}

// once sorts names, each once.
func once(names []string) []string {
	slices.Sort(names)
	return slices.Compact(names)
}
