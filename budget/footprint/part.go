package footprint

import (
	"errors"
	"fmt"
	"io"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// Source gives the lines of one record; *record.Reader is one.
type Source interface {
	Next() (*record.Line, error)
	Meters() []string
	Findings() *finding.List
	Notes() []string
	Name() string
}

// MaxSpan is the longest run that is weighed. Longer ones are mistakes in a
// time more often than runs.
const MaxSpan = 2 * unit.Year

// Numbers beyond these are mistakes too, and would not let sums stay finite.
const (
	most     = 1e24 // W, J and kWh
	mostWork = 1e100
)

// Meter is what one meter of a part measured.
type Meter struct {
	Name     string
	Measured unit.Energy
	Filled   unit.Energy // by its mean power, where it has gaps
}

// Part is the footprint of one record: one part of one run.
type Part struct {
	File    string
	Open    record.Open // zero where the record has no readable open line
	End     unit.Instant
	Outcome record.Outcome // failed where there is no close line
	Closed  bool           // there is a close line
	Facts   Facts
	Meters  []Meter
	Averaged,
	Estimated bool // from used lines, and from estimated ones
	Work     *record.Work // the last work line; nil if there is none
	Findings *finding.List
	Notes    []string
	Doubts   []Doubt
	Digest   string // hash of the energy lines; empty if there are none

	Progress []Progress // at its work lines, or as many of them as are kept; nil for totals
	Pilot    bool       // it did less than was planned

	// Of a part that comes from the books: the account that it is charged to,
	// and the hash of its inputs where that was known.
	Account string
	Inputs  string

	metered   unit.Energy // at the meters: measured and filled
	measured  unit.Sum[unit.Energy]
	filled    unit.Sum[unit.Energy]
	unmetered unit.Energy // of machine, what a declared unmetered power adds
	machine   unit.Energy
	facility  unit.Energy
	priced    [4]priced // by grid.Source
	market    unit.Mass
	proven    proven
	hours     []Hour
	embodied  unit.Mass
	expected  float64 // standard uncertainty of the expected hours, g: one weather, so they add
	random    random
}

// priced is the part's facility energy of one source of price.
type priced struct {
	energy unit.Energy
	known  bool
	mass   unit.Mass
}

// proven is what the measured energy alone makes: a lower bound. Holes of the
// series are left out, for they are priced only when they are small.
type proven struct {
	facility    unit.Energy
	operational unit.Mass
}

// random are the variances of the part's independent errors.
type random struct{ facility, mass float64 }

// Hour is the facility energy used in a span that starts at From, an hour of
// UTC cut at the steps of the series where those are finer, and what it was
// charged with. G is nil where the span has no price.
type Hour struct {
	From unit.Instant `json:"from"`
	KWh  unit.Energy  `json:"kwh"`
	G    *unit.Mass   `json:"g,omitempty"`  // operational
	By   grid.Source  `json:"by,omitempty"` // where the price comes from; absent: from the series
}

// Opened tells whether the record has a readable open line.
func (p *Part) Opened() bool { return p.Open.Run != "" }

// Weigh makes one pass over a record. look gives the facts for its open line.
// What is wrong with the record is in the Part; an error is a failure to read.
func Weigh(src Source, method Method, look func(*record.Open) Facts) (*Part, error) {
	w := &weighing{part: &Part{File: src.Name(), Outcome: record.Failed, Findings: src.Findings()}, method: method, look: look}
	w.hash = newDigest()
	for {
		l, err := src.Next()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			return nil, err
		}
		w.take(l)
	}
	w.part.Notes = src.Notes()
	if w.part.Opened() {
		w.finish(src.Meters())
	}
	return w.part, nil
}

// weighing is the state of one pass.
type weighing struct {
	part   *Part
	method Method
	look   func(*record.Open) Facts
	line   timeline
	meters []*meter // by index of the record's meters
	totals timeline // of used lines, apart: they count only where there is no meter
	total  *meter   // nil if there are none
	rated  float64
	hash   *digest
	steps  progress

	refused string // the first line that cannot be of the run, and why
}

func (w *weighing) take(l *record.Line) {
	p := w.part
	if l.Kind == record.KindOpen {
		w.open(l)
		return
	}
	if why := p.impossible(l); why != "" {
		if w.refused == "" {
			w.refused = fmt.Sprintf("%s:%d: %s", p.File, l.No, why)
		}
		return
	}
	p.End = max(p.End, l.At)
	switch l.Kind {
	case record.KindPower:
		w.hash.line(l)
		w.meter(l).sample(l)
	case record.KindEnergy:
		w.hash.line(l)
		w.meter(l).count(l)
	case record.KindUsed:
		w.hash.line(l)
		w.used(l)
	case record.KindWork:
		p.Work = l.Work
		w.steps.mark(l.At, l.Work.Done, w.meters)
	case record.KindClose:
		p.Outcome, p.Closed = l.Close.Outcome, true
		p.Pilot = p.Outcome == record.Pilot
	}
}

// impossible tells what is wrong with a line that cannot be of the run.
func (p *Part) impossible(l *record.Line) string {
	switch {
	case l.At < p.Open.At || l.At.Sub(p.Open.At) > MaxSpan:
		return fmt.Sprintf("a time before the record opens or more than %s after", MaxSpan)
	case l.Power > most || l.Joules > most || l.Wrap > most || l.Used != nil && l.Used.Energy > most:
		return "a reading beyond anything that can be measured"
	case l.Work != nil && (l.Work.Done > mostWork || l.Work.Planned > mostWork || l.Work.Done > 0 && l.Work.Done < 1/mostWork):
		return "an amount of work beyond anything that can be done"
	}
	return ""
}

func (w *weighing) open(l *record.Line) {
	p := w.part
	p.Open, p.End = *l.Open, l.At
	p.Facts = w.look(&p.Open)
	w.steps.start = l.At
	w.line = timeline{pricer: p.Facts.pricer(w.method), start: l.At}
	w.totals = w.line
	if m := p.Facts.Machine; m != nil && m.Rated != nil {
		w.rated = float64(*m.Rated) * p.Facts.reservation(p.Open.Reserved)
		if m.Unmetered == nil {
			w.rated *= float64(m.MeasuredShare)
		}
	}
}

func (w *weighing) meter(l *record.Line) *meter {
	for l.Meter >= len(w.meters) {
		w.meters = append(w.meters, nil)
	}
	if w.meters[l.Meter] == nil {
		w.meters[l.Meter] = w.newMeter(l.Kind, &w.line)
	}
	return w.meters[l.Meter]
}

func (w *weighing) newMeter(k record.Kind, line *timeline) *meter {
	return &meter{kind: k, line: line, maxGap: w.method.MaxGap, rated: w.rated, at: w.part.Open.At, marks: &w.steps}
}

func (w *weighing) used(l *record.Line) {
	if w.total == nil {
		w.total = w.newMeter(record.KindUsed, &w.totals)
	}
	w.part.Averaged = true
	w.part.Estimated = w.part.Estimated || !l.Used.Measured
	w.total.used(l)
}

// finish closes the meters and prices the part.
func (w *weighing) finish(names []string) {
	p := w.part
	p.Digest = w.hash.sum()
	switch {
	case w.total != nil && len(names) > 0:
		p.doubt(Doubt{Reason: fmt.Sprintf("two accounts of one run: %s has used lines and lines of meters", p.File)})
	case w.total != nil:
		w.line = w.totals
		w.total.line = &w.line
		w.close("used", w.total)
	}
	for n, m := range w.meters {
		w.close(names[n], m)
	}
	if w.total == nil {
		p.Progress = w.steps.told()
	}
	if len(p.Meters) == 0 {
		p.doubt(Doubt{Reason: "no energy: " + p.File + " has no power, energy or used lines"})
	}
	if w := p.Work; w != nil && w.Planned > w.Done && p.Outcome.Evidence() && p.Outcome != record.Stopped {
		p.Pilot = true
	}
	if w.refused != "" {
		p.doubt(Doubt{Reason: w.refused, Refutes: true})
	}
	w.settle()
	w.plausible()
}

// close ends one meter and fills its gaps.
func (w *weighing) close(name string, m *meter) {
	if m == nil { // every line of it was refused
		return
	}
	p := w.part
	m.finish(p.End)
	measured, filled := m.total.Value().Energy(), m.fill().Energy()
	p.Meters = append(p.Meters, Meter{name, measured, filled})
	p.measured.Add(measured)
	p.filled.Add(filled)
	switch {
	case m.covered == 0:
		p.doubt(Doubt{Reason: fmt.Sprintf("meter %s of %s has no covered time", name, p.File)})
	case m.total.Value() == 0:
		p.doubt(Doubt{Reason: fmt.Sprintf("meter %s of %s measured no energy over the run", name, p.File)})
	}
	if m.above > 0 {
		p.doubt(Doubt{Reason: fmt.Sprintf("%s:%d: meter %s reads %s, above the rated power; %d readings are",
			p.File, m.firstAbove.No, name, m.firstAbove.Power, m.above),
			Observed: float64(m.firstAbove.Power), Limit: m.rated, Unit: "W", Refutes: true})
	}
	w.gapVariance(m)
}

func (p *Part) doubt(d Doubt) { p.Doubts = append(p.Doubts, d) }

// MeasuredEnergy is what the part's meters measured, without filled gaps.
func (p *Part) MeasuredEnergy() unit.Energy { return p.measured.Value() }
