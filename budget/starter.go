package budget

import (
	"fmt"
	"slices"
	"strings"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// room is how far a starter limit lies above the largest run seen.
const room = 1.25

// Starter is what init fills its templates with.
type Starter struct {
	Sites    []string
	Machines []StarterMachine
	Jobs     []StarterJob
	Series   []string
	Unknown  []string // what the records cannot tell and a person must
}

// StarterMachine is a kind of machine as records show it.
type StarterMachine struct {
	Name   string
	Units  float64
	Meters int // of the whole machine; 0 if no record shows it whole

	perUnit float64 // meters for one unit, as the records of some units show
}

// StarterJob is a job as records show it.
type StarterJob struct {
	Name, Stage string
	Limit       string // room above the largest run; empty where no run has a figure
}

// Quote writes a text as a TOML string in plain ASCII. Records are untrusted
// even here.
func (Starter) Quote(text string) string {
	var b strings.Builder
	b.WriteByte('"')
	for _, r := range text { // bytes that are no UTF-8 come as U+FFFD
		switch {
		case r == '"' || r == '\\':
			b.WriteByte('\\')
			b.WriteRune(r)
		case r < ' ' || r > '~':
			fmt.Fprintf(&b, `\U%08X`, r)
		default:
			b.WriteRune(r)
		}
	}
	return b.String() + `"`
}

// NewStarter collects jobs, sites, machines and limits from runs that were
// weighed without a policy. Without a series the limits are energies.
func NewStarter(runs []*footprint.Run, series []string) Starter {
	s := Starter{Series: series}
	for _, r := range runs {
		for _, part := range r.Pieces {
			s.place(part)
		}
	}
	slices.Sort(s.Sites)
	for _, group := range byJob(runs) {
		s.Jobs = append(s.Jobs, StarterJob{group[0].Job, group[0].Stage, limitFrom(group)})
	}
	s.unknown()
	return s
}

func (s *Starter) place(part *footprint.Part) {
	o := part.Open
	if o.Site != "" && !slices.Contains(s.Sites, o.Site) {
		s.Sites = append(s.Sites, o.Site)
	}
	if o.Machine == "" {
		return
	}
	n := slices.IndexFunc(s.Machines, func(m StarterMachine) bool { return m.Name == o.Machine })
	if n < 0 {
		n = len(s.Machines)
		s.Machines = append(s.Machines, StarterMachine{Name: o.Machine, Units: 1})
	}
	m := &s.Machines[n]
	m.Units = max(m.Units, o.Reserved)
	if part.Averaged { // a total is of no meter
		return
	}
	if o.Reserved > 0 {
		m.perUnit = max(m.perUnit, float64(len(part.Meters))/o.Reserved)
	} else { // the whole machine: all its meters are there
		m.Meters = max(m.Meters, len(part.Meters))
	}
	if m.perUnit > 0 { // as many units as have all the meters
		m.Units = max(m.Units, float64(m.Meters)/m.perUnit)
	}
}

// limitFrom leaves room above the largest run.
func limitFrom(runs []*footprint.Run) string {
	var mass unit.Mass
	var energy unit.Energy
	for _, r := range runs {
		if r.Total != nil {
			mass = max(mass, *r.Total)
		}
		if r.Facility != nil {
			energy = max(energy, *r.Facility)
		}
	}
	switch {
	case mass > 0:
		return (mass * room).String()
	case energy > 0:
		return (energy * room).String()
	}
	return ""
}

func (s *Starter) unknown() {
	for _, site := range s.Sites {
		s.Unknown = append(s.Unknown, fmt.Sprintf("the grid zone of site %s (its own name is taken) and its PUE (1 is taken)", site))
	}
	for _, m := range s.Machines {
		s.Unknown = append(s.Unknown, fmt.Sprintf("of machine %s: units, measured share (1 is taken), embodied emissions, idle and rated power", m.Name))
	}
	if len(s.Series) == 0 {
		s.Unknown = append(s.Unknown, "the carbon intensity: name your series in [grid] (limits are energies until then)")
	}
}
