package budget

import (
	"github.com/pelletier/go-toml/v2"

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
