package budget

import (
	"fmt"
	"maps"
	"reflect"
	"slices"
	"strings"

	"github.com/pelletier/go-toml/v2"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// Policy is the budget file of a repository, or several that add up. Each
// table knows its place, for rulings are told by the line of their rule.
type Policy struct {
	Place                           // of the keys outside any table
	Format      int                 `toml:"format,required"`
	Account     Account             `toml:"account"`
	Evidence    Evidence            `toml:"evidence"`
	Grid        Grid                `toml:"grid"`
	Sites       map[string]*Site    `toml:"site"`
	Machines    map[string]*Machine `toml:"machine"`
	Jobs        []*Job              `toml:"job"`
	Budgets     []*Budget           `toml:"budget"`
	Regressions []*Regression       `toml:"regression"`
	Waivers     []*Waiver           `toml:"waiver"`

	Files  []string // as the user named them
	Prefix string   // what leads to Files from the root of the repository, with slashes
	bare   bool     // no policy at all: sites stand for zones
}

// Account is how sums are made and decided.
type Account struct {
	Place
	Factor      grid.Factor `toml:"factor" oneof:"average marginal"`
	Timezone    string      `toml:"timezone"`
	Decision    Decision    `toml:"decision" oneof:"simple guarded"`
	ReleaseTags string      `toml:"release_tags"`
	Uncertainty Uncertainty `toml:"uncertainty"`
}

// Decision is the rule by which a measured value meets a limit (JCGM 106:2012).
type Decision string

// The decision rules.
const (
	Simple  Decision = "simple"  // the value alone decides
	Guarded Decision = "guarded" // guard band of the expanded uncertainty
)

// Uncertainty is the declared relative standard uncertainties, k = 1.
type Uncertainty struct {
	Place
	Meter     *unit.Share `toml:"meter"`
	Share     *unit.Share `toml:"share"`
	PUE       *unit.Share `toml:"pue"`
	Intensity *unit.Share `toml:"intensity"`
	Embodied  *unit.Share `toml:"embodied"`
}

// Evidence is what a run's record must show.
type Evidence struct {
	Place
	MaxGap      unit.Duration   `toml:"max_gap"`
	MinCoverage unit.Share      `toml:"min_coverage"`
	MaxAge      unit.Duration   `toml:"max_age"`
	SameInputs  bool            `toml:"same_inputs"`
	MinGrade    footprint.Grade `toml:"min_grade" oneof:"measured filled averaged estimated"`
	Unproven    string          `toml:"unproven" oneof:"close warn"`
}

// Grid names the series.
type Grid struct {
	Place
	Series   []string      `toml:"series"` // globs, relative to the policy file
	Boundary grid.Boundary `toml:"boundary" oneof:"direct lifecycle"`
	Columns  Columns       `toml:"columns"`
}

// Columns maps the contract's column names to those of the files.
type Columns struct {
	Place
	Zone    string `toml:"zone"`
	From    string `toml:"from"`
	To      string `toml:"to"`
	GPerKWh string `toml:"g_per_kwh"`
	Factor  string `toml:"factor"`
}

// Site is a place where jobs run.
type Site struct {
	Place
	Name        string
	Zone        string          `toml:"zone,required"`
	PUE         *float64        `toml:"pue"` // at least 1 (ISO/IEC 30134-2); absent counts 1, which runs note
	Annual      *unit.Intensity `toml:"annual"`
	Market      *unit.Intensity `toml:"market"`
	MarketBasis string          `toml:"market_basis" oneof:"contract supplier residual"`
}

// Machine is a kind of machine.
type Machine struct {
	Place
	Name          string
	Units         float64        `toml:"units"`          // 1 if absent
	MeasuredShare *unit.Share    `toml:"measured_share"` // absent without unmetered counts 1, which runs note
	Unmetered     *unit.Power    `toml:"unmetered"`
	Meters        int            `toml:"meters"`
	Idle          *unit.Power    `toml:"idle"`
	Rated         *unit.Power    `toml:"rated"`
	Embodied      *unit.Mass     `toml:"embodied"`
	Lifetime      *unit.Duration `toml:"lifetime"`
}

// Job is a pipeline that the policy knows.
type Job struct {
	Place
	Name          string         `toml:"name,required"`
	Stage         string         `toml:"stage"` // empty: any
	Required      bool           `toml:"required"`
	Paths         []string       `toml:"paths"`
	Sites         []string       `toml:"sites"`    // empty: any the policy knows
	Machines      []string       `toml:"machines"` // empty: any the policy knows
	Work          *unit.Work     `toml:"work"`
	Schedule      string         `toml:"schedule"`
	Window        *unit.Duration `toml:"window"`
	Interruptible bool           `toml:"interruptible"`
	Stretch       *float64       `toml:"stretch"`
	Slot          *unit.Duration `toml:"slot"`
	MinSlice      *unit.Duration `toml:"min_slice"`
	ResumeKWh     *float64       `toml:"resume_kwh"`
}

// Budget is a limit on what a branch may spend.
type Budget struct {
	Place
	Name    string      `toml:"name,required"`
	Branch  string      `toml:"branch"` // glob, ** if absent; like Job and Stage
	Job     string      `toml:"job"`
	Stage   string      `toml:"stage"`
	Limit   Limit       `toml:"limit,required"`
	Per     string      `toml:"per,required" oneof:"run pull day week month quarter year release"`
	WarnAt  *unit.Share `toml:"warn_at"`
	Landing string      `toml:"landing" oneof:"warn close"`
}

// Regression is a limit on how much more than its base a change may emit.
type Regression struct {
	Place
	Name       string      `toml:"name,required"`
	Branch     string      `toml:"branch"`
	Job        string      `toml:"job"`
	Stage      string      `toml:"stage"`
	Measure    string      `toml:"measure" oneof:"total rate energy"`
	MaxRise    unit.Share  `toml:"max_rise,required"`
	Grid       string      `toml:"grid" oneof:"hold actual"`
	Against    string      `toml:"against" oneof:"branch release"`
	BaseRuns   int         `toml:"base_runs"`
	Confidence *unit.Share `toml:"confidence"`
}

// Waiver excuses one rule for a while.
type Waiver struct {
	Place
	Rule       string         `toml:"rule,required"`
	Pull       int            `toml:"pull"`
	Extra      *Limit         `toml:"extra"`
	Reason     string         `toml:"reason,required"`
	ApprovedBy string         `toml:"approved_by,required"`
	Expires    toml.LocalDate `toml:"expires,required"`
}

// Limit is a mass, an energy or a rate; exactly one is set.
type Limit struct {
	Mass   *unit.Mass
	Energy *unit.Energy
	Rate   *unit.Rate
}

// Set parses text like "40 kg", "12 kWh" or "1.2 g per 1000 step".
func (l *Limit) Set(text string) error {
	if strings.Contains(text, " per ") {
		l.Rate = new(unit.Rate)
		return l.Rate.Set(text)
	}
	if e, err := unit.ParseEnergy(text); err == nil {
		l.Energy = &e
		return nil
	}
	m, err := unit.ParseMass(text)
	if err != nil {
		return fmt.Errorf("%w; a limit may also be an energy, like %q, or a rate, like %q", err, "12 kWh", "1.2 g per 1000 step")
	}
	l.Mass = &m
	return nil
}

func (l Limit) String() string {
	switch {
	case l.Mass != nil:
		return l.Mass.String()
	case l.Energy != nil:
		return l.Energy.String()
	}
	return l.Rate.String()
}

// defaults is a policy with the values of keys that are absent.
func defaults() *Policy {
	return &Policy{
		Account: Account{Factor: grid.Average, Timezone: "UTC", Decision: Simple, ReleaseTags: "v*"},
		Evidence: Evidence{MaxGap: 2 * unit.Minute, MinCoverage: 0.95, MaxAge: 72 * unit.Hour, SameInputs: true,
			MinGrade: footprint.Averaged, Unproven: "close"},
		Grid: Grid{Boundary: grid.Direct},
	}
}

// Bare is what stands in where there is no policy: a record's site is taken as
// its zone, PUE 1, measured share 1, no embodied emissions.
func Bare() *Policy {
	p := defaults()
	p.bare = true
	return p
}

// PolicyFile is one policy file, read.
type PolicyFile struct {
	Name string
	Data []byte
}

// ParsePolicy reads policy files that add up. With any finding the policy must
// not be used; all findings are listed, in order of file and line.
func ParsePolicy(files ...PolicyFile) (*Policy, []finding.Finding) {
	var found []finding.Finding
	report := func(f finding.Finding) { found = append(found, f) }
	p := defaults()
	var whole *node
	broken := false
	for _, f := range files {
		p.Files = append(p.Files, f.Name)
		n, bad := parseDocument(f.Data, f.Name)
		switch {
		case bad != nil:
			report(*bad)
			broken = true
		case whole == nil:
			whole = n
		default:
			whole.shareFormat(n)
			whole.merge(n, report)
		}
	}
	if whole != nil && !broken {
		decoder{report}.table(whole, reflect.ValueOf(p).Elem(), "")
		p.complete()
		p.check(besides(found, report))
	}
	slices.SortStableFunc(found, func(a, b finding.Finding) int {
		if c := slices.Index(p.Files, a.File) - slices.Index(p.Files, b.File); c != 0 {
			return c
		}
		return a.Line - b.Line
	})
	return p, found
}

// complete fills in what absent keys of repeated tables mean.
func (p *Policy) complete() {
	for _, m := range p.Machines {
		if !m.said("units") {
			m.Units = 1
		}
	}
	for _, b := range p.Budgets {
		b.anywhere(&b.Branch, &b.Job, &b.Stage)
		b.Landing = or(b.Landing, "warn")
	}
	for _, r := range p.Regressions {
		r.anywhere(&r.Branch, &r.Job, &r.Stage)
		r.Measure, r.Grid, r.Against = or(r.Measure, "total"), or(r.Grid, "hold"), or(r.Against, "branch")
		if !r.said("base_runs") {
			r.BaseRuns = 10
		}
	}
}

// anywhere gives a rule that names no branch, job or stage the glob for all. An
// empty glob that somebody wrote stays, and is refused.
func (p Place) anywhere(branch, job, stage *string) {
	for key, glob := range map[string]*string{"branch": branch, "job": job, "stage": stage} {
		if !p.said(key) {
			*glob = "**"
		}
	}
}

// besides reports what is found besides what was told of the same line: what
// could not be read has no value to check.
func besides(told []finding.Finding, report func(finding.Finding)) func(finding.Finding) {
	told = slices.Clone(told)
	return func(f finding.Finding) {
		if !slices.ContainsFunc(told, func(t finding.Finding) bool { return t.File == f.File && t.Line == f.Line }) {
			report(f)
		}
	}
}

// names are the keys of a table of names, sorted.
func names[V any](m map[string]V) []string { return slices.Sorted(maps.Keys(m)) }
