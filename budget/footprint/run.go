package footprint

import (
	"fmt"
	"slices"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// Grade tells how a run's energy is known.
type Grade string

// The grades, best first.
const (
	Measured  Grade = "measured"
	Filled    Grade = "filled"    // some gap filled
	Averaged  Grade = "averaged"  // totals only
	Estimated Grade = "estimated" // estimated totals
)

// Grades are the grades, best first.
var Grades = []Grade{Measured, Filled, Averaged, Estimated}

// Worse tells whether g is a lower grade than least.
func (g Grade) Worse(least Grade) bool {
	return slices.Index(Grades, g) > slices.Index(Grades, least)
}

// Priced are the shares of facility energy by the source of their price. They
// add up to less than 1 where a hole of the series has none.
type Priced struct {
	Series   unit.Share `json:"series"`
	Expected unit.Share `json:"expected"`
	Annual   unit.Share `json:"annual"`
}

// Run is the footprint of one attempt of one run: the sum over its parts. Its
// JSON is the runs object of the statement and of the ledger. A nil figure is
// one that is not known; none of them is zero for want of evidence.
type Run struct {
	Run      string            `json:"run"`
	Attempt  int               `json:"attempt"`
	Job      string            `json:"job"`
	Stage    string            `json:"stage,omitempty"`
	Side     string            `json:"side,omitempty"` // base or head
	Site     string            `json:"site,omitempty"` // like zone, machine, host: where all parts share it
	Zone     string            `json:"zone,omitempty"`
	Machine  string            `json:"machine,omitempty"`
	Host     string            `json:"host,omitempty"`
	Labels   map[string]string `json:"labels,omitempty"`
	Start    unit.Instant      `json:"start"`
	End      unit.Instant      `json:"end"`
	Outcome  record.Outcome    `json:"outcome"`
	Grade    Grade             `json:"grade,omitempty"`
	Coverage *unit.Share       `json:"coverage,omitempty"`
	Factor   grid.Factor       `json:"factor"`
	Boundary grid.Boundary     `json:"boundary"`
	Inputs   string            `json:"inputs,omitempty"`
	Priced   *Priced           `json:"priced,omitempty"`

	Measured    *unit.Energy    `json:"measured_kwh,omitempty"` // at the meters, filled gaps included
	MachineKWh  *unit.Energy    `json:"machine_kwh,omitempty"`
	Facility    *unit.Energy    `json:"facility_kwh,omitempty"`
	Operational *unit.Mass      `json:"operational_g,omitempty"`
	Embodied    *unit.Mass      `json:"embodied_g,omitempty"`
	Total       *unit.Mass      `json:"total_g,omitempty"`
	Expanded    *unit.Mass      `json:"expanded_g,omitempty"` // expanded uncertainty of Total, k = 2
	Market      *unit.Mass      `json:"market_g,omitempty"`
	Intensity   *unit.Intensity `json:"intensity_g_per_kwh,omitempty"`
	Work        *record.Work    `json:"work,omitempty"`
	Rate        *float64        `json:"rate_g_per_unit,omitempty"`
	Pilot       bool            `json:"pilot,omitempty"`

	ProjectedKWh   *unit.Energy `json:"projected_kwh,omitempty"` // of a pilot, at the facility: what its whole work would take
	ProjectedTotal *unit.Mass   `json:"projected_total_g,omitempty"`
	ProjectedLow   *unit.Mass   `json:"projected_low_g,omitempty"` // 95 %
	ProjectedHigh  *unit.Mass   `json:"projected_high_g,omitempty"`

	Parts []RunPart `json:"parts"`
	Notes []string  `json:"notes,omitempty"`

	Projection *Whole `json:"-"` // of a pilot; nil where nothing can be projected

	Proven Proven  `json:"-"`
	Terms  Figures `json:"-"`
	Hours  []Hour  `json:"-"` // facility energy, in order of time
	Doubts []Doubt `json:"-"`
	Pieces []*Part `json:"-"`
}

// RunPart is what a statement shows of one part.
type RunPart struct {
	Part     string         `json:"part,omitempty"`
	Host     string         `json:"host,omitempty"`
	Site     string         `json:"site,omitempty"`
	Machine  string         `json:"machine,omitempty"`
	Reserved float64        `json:"reserved,omitempty"`
	Start    unit.Instant   `json:"start"`
	End      unit.Instant   `json:"end"`
	Outcome  record.Outcome `json:"outcome"`
	Coverage *unit.Share    `json:"coverage,omitempty"`
	Measured *unit.Energy   `json:"measured_kwh,omitempty"`
	Meters   []string       `json:"meters,omitempty"`
	Digest   string         `json:"digest,omitempty"`
}

// Proven is what the measured, priced part of a run alone amounts to: a lower
// bound that holds however thin the rest of the evidence is.
type Proven struct {
	Total    unit.Mass
	Facility unit.Energy
}

// Figures are the terms of a run's mass and of its facility energy.
type Figures struct{ Mass, Energy Terms }

// note adds notes, each once.
func (r *Run) note(notes ...string) {
	for _, n := range notes {
		if !slices.Contains(r.Notes, n) {
			r.Notes = append(r.Notes, n)
		}
	}
}

// Known tells whether the run's total is known and nothing speaks against it.
func (r *Run) Known() bool { return r.Total != nil && len(r.Doubts) == 0 }

// Doubt adds a reason against the run's evidence.
func (r *Run) Doubt(d Doubt) { r.Doubts = append(r.Doubts, d) }

// Refuted tells whether a doubt concerns the measured energy itself.
func (r *Run) Refuted() bool {
	return slices.ContainsFunc(r.Doubts, func(d Doubt) bool { return d.Refutes })
}

// Combine makes the run of its parts, which all have an open line with the
// same run and attempt, each part once.
func Combine(parts []*Part, m Method) *Run {
	first := parts[0]
	r := &Run{
		Run: first.Open.Run, Attempt: first.Open.Attempt, Job: first.Open.Job, Stage: first.Open.Stage,
		Labels: first.Open.Labels, Start: first.Open.At, End: first.End, Factor: m.Factor, Boundary: m.Boundary, Pieces: parts,
	}
	r.Site = shared(parts, func(p *Part) string { return p.Open.Site })
	r.Zone = shared(parts, (*Part).zone)
	r.Machine = shared(parts, func(p *Part) string { return p.Open.Machine })
	r.Host = shared(parts, func(p *Part) string { return p.Open.Host })
	for _, p := range parts {
		r.Start, r.End = min(r.Start, p.Open.At), max(r.End, p.End)
		r.note(p.Notes...)
		r.note(p.Facts.Assumed...)
		r.Doubts = append(r.Doubts, p.Doubts...)
		r.Parts = append(r.Parts, p.show())
		if p.Findings.Len() > 0 {
			r.Doubt(p.unreadable())
		}
	}
	r.outcome()
	r.whole()
	r.progress()
	r.energies(m)
	r.masses(m)
	return r
}

// unreadable is the doubt about a record of which some lines cannot count.
func (p *Part) unreadable() Doubt {
	return Doubt{Reason: fmt.Sprintf("%d lines of %s cannot count, first %s", p.Findings.Len(), p.File, p.Findings.First())}
}

func (p *Part) zone() string {
	if p.Facts.Site == nil {
		return ""
	}
	return p.Facts.Site.Zone
}

// shared is what all parts have in common, else "".
func shared(parts []*Part, of func(*Part) string) string {
	value := of(parts[0])
	if slices.ContainsFunc(parts, func(p *Part) bool { return of(p) != value }) {
		return ""
	}
	return value
}

func (p *Part) show() RunPart {
	show := RunPart{Part: p.Open.Part, Host: p.Open.Host, Site: p.Open.Site, Machine: p.Open.Machine, Reserved: p.Open.Reserved,
		Start: p.Open.At, End: p.End, Outcome: p.Outcome, Digest: p.Digest}
	if len(p.Meters) > 0 {
		show.Measured = &p.metered
		show.Coverage = coverage(p.measured.Value(), p.filled.Value())
	}
	for _, m := range p.Meters {
		show.Meters = append(show.Meters, m.Name)
	}
	return show
}

// coverage is nil where there is no energy to cover.
func coverage(measured, filled unit.Energy) *unit.Share {
	if measured+filled <= 0 {
		return nil
	}
	c := unit.Share(float64(measured) / float64(measured+filled))
	return &c
}

// outcome takes the worst of the parts.
func (r *Run) outcome() {
	worst := []record.Outcome{record.OK, record.Pilot, record.Stopped, record.Cancelled, record.Failed}
	n := 0
	for _, p := range r.Pieces {
		n = max(n, slices.Index(worst, p.Outcome))
	}
	r.Outcome = worst[n]
}

// whole checks that all parts are there and tell of one run.
func (r *Run) whole() {
	first := r.Pieces[0]
	have, want := len(r.Pieces), first.Open.Parts
	if have > max(want, 1) {
		r.Doubt(Doubt{Reason: fmt.Sprintf("parts disagree: run %s has %d parts, more than the %d it says", r.Run, have, max(want, 1)),
			Observed: float64(have), Limit: float64(max(want, 1)), Unit: "parts"})
	}
	if have < want {
		r.Doubt(Doubt{Missing: true, Reason: fmt.Sprintf("part missing: run %s has %d of %d parts", r.Run, have, want),
			Observed: float64(have), Limit: float64(want), Unit: "parts"})
	}
	for _, p := range r.Pieces[1:] {
		a, b := first.Open, p.Open
		if a.Job != b.Job || a.Stage != b.Stage || max(a.Parts, 1) != max(b.Parts, 1) {
			r.Doubt(Doubt{Reason: fmt.Sprintf("parts disagree: %s and %s name one run but not the same job, stage and number of parts", first.File, p.File)})
		}
	}
}

// progress sums the work: one shared count, or the sum over parts. There is
// none where the parts tell it differently.
func (r *Run) progress() {
	for _, p := range r.Pieces {
		w := p.Work
		switch {
		case w == nil:
		case r.Work == nil:
			sum := *w
			r.Work = &sum
		case w.Unit != r.Work.Unit || w.OfPart != r.Work.OfPart:
			r.Doubt(Doubt{Reason: fmt.Sprintf("work is told differently: in %q of %s and in %q of %s", r.Work.Unit, scope(r.Work), w.Unit, scope(w))})
			r.Work = nil // neither counts for the other
			return
		case w.OfPart:
			r.Work.Done += w.Done
			r.Work.Planned += w.Planned
		default:
			r.Work.Done = max(r.Work.Done, w.Done)
			r.Work.Planned = max(r.Work.Planned, w.Planned)
		}
	}
}

// Commit is the commit that all parts of the run name; "" if they do not.
func (r *Run) Commit() string {
	return shared(r.Pieces, func(p *Part) string { return p.Open.Commit })
}

// Booked is the hash of the run's inputs with which all its parts were booked;
// "" if it is not known.
func (r *Run) Booked() string { return shared(r.Pieces, func(p *Part) string { return p.Inputs }) }

// Account is the account that the run was booked to; "" if it is not in the
// books.
func (r *Run) Account() string { return shared(r.Pieces, func(p *Part) string { return p.Account }) }

// scope tells whose work a work line counts.
func scope(w *record.Work) string {
	if w.OfPart {
		return "the part"
	}
	return "the run"
}
