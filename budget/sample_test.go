package budget_test

import (
	"testing"

	"github.com/pelletier/go-toml/v2"
	"github.com/stretchr/testify/assert"

	"budgetcheck/budget"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// sample has every table of a policy.
const sample = `format = 1

[account]
factor   = "average"          # average | marginal; never mixed in one sum or comparison
timezone = "UTC"              # calendar of day, week, month, quarter, year
decision = "simple"           # simple | guarded
release_tags = "v*"           # where the ledger holds no release marks
uncertainty = { meter = "2%", share = "5%", pue = "3%", intensity = "8%", embodied = "30%" }   # standard, k = 1

[evidence]
max_gap = "2m"
min_coverage = 0.95
max_age = "72h"               # not for runs bound to the change by their inputs
same_inputs = true            # a head run must stand for the head commit
min_grade = "averaged"        # measured | filled | averaged | estimated
unproven = "close"            # close | warn

[grid]
series = ["grid/*.csv"]
boundary = "direct"           # direct | lifecycle; only direct is called scope 2

[grid.columns]
zone = "area"
from = "begin"
to = "end"
g_per_kwh = "intensity"
factor = "kind"

[site.quay-north]
zone = "NORTH"
pue = 1.18
annual = "412 g/kWh"
market = "305 g/kWh"          # shown beside, never ruled on
market_basis = "residual"     # contract | supplier | residual

[site.quay-south]
zone = "SOUTH"

[machine.quad]
units = 4
measured_share = 0.75         # share of the machine's electricity that its meters see
meters = 4                    # how many meters a fully reserved machine has
idle = "240 W"                # mean power below this is not plausible
rated = "2.8 kW"              # a reading above this is not plausible
embodied = "1400 kg"
lifetime = "4y"

[machine.lone]
unmetered = "320 W"

[[job]]
name = "retrain-tide"
stage = "training"
required = true
paths = ["tide/**", "requirements.lock"]
sites = ["quay-north", "quay-south"]
machines = ["quad"]
work = "100000 step"
schedule = "15 2 * * *"
window = "24h"
interruptible = true
stretch = 2.0
slot = "5m"
min_slice = "30m"
resume_kwh = 0.05

[[budget]]
name = "main, month"
branch = "main"
job = "**"
stage = "**"
limit = "40 kg"
per = "month"
warn_at = 0.8
landing = "warn"

[[regression]]
name = "main, no creep"
branch = "main"
job = "**"
stage = "**"
measure = "total"
max_rise = "5%"
grid = "hold"
against = "branch"
base_runs = 10
confidence = 0.95

[[waiver]]
rule = "main, month"
pull = 214
extra = "3 kg"
reason = "one-off backfill after the gauge was recalibrated"
approved_by = "@quay-lead"
expires = 2031-04-01
`

func to[T any](v T) *T { return &v }

// at is where a table of the sample stands. What else a Place holds is not
// compared.
func at(t *testing.T, words string) int { return lineOf(t, sample, words) }

func TestSampleGlobals(t *testing.T) {
	p := policyOf(t, sample)
	assert.Equal(t, 1, p.Format)
	a, u, e, g := p.Account, p.Account.Uncertainty, p.Evidence, p.Grid
	assert.Equal(t, at(t, "[account]"), a.Line)
	assert.Equal(t, "budgetcheck.toml", a.File)
	assert.Equal(t, []any{grid.Average, "UTC", budget.Simple, "v*"}, []any{a.Factor, a.Timezone, a.Decision, a.ReleaseTags})
	assert.Equal(t, []*unit.Share{to[unit.Share](0.02), to[unit.Share](0.05), to[unit.Share](0.03), to[unit.Share](0.08), to[unit.Share](0.30)},
		[]*unit.Share{u.Meter, u.Share, u.PUE, u.Intensity, u.Embodied})
	assert.Equal(t, []any{2 * unit.Minute, unit.Share(0.95), 72 * unit.Hour, true, footprint.Averaged, "close"},
		[]any{e.MaxGap, e.MinCoverage, e.MaxAge, e.SameInputs, e.MinGrade, e.Unproven})
	assert.Equal(t, []any{[]string{"grid/*.csv"}, grid.Direct}, []any{g.Series, g.Boundary})
	assert.Equal(t, grid.Columns{Zone: "area", From: "begin", To: "end", GPerKWh: "intensity", Factor: "kind"}, g.ColumnNames())
}

func TestSamplePlaces(t *testing.T) {
	p := policyOf(t, sample)
	s, q := p.Sites["quay-north"], p.Machines["quad"]
	assert.Equal(t, []any{"quay-north", "NORTH", to(1.18), to[unit.Intensity](412), to[unit.Intensity](305), "residual"},
		[]any{s.Name, s.Zone, s.PUE, s.Annual, s.Market, s.MarketBasis})
	assert.Equal(t, at(t, "[site.quay-north]"), s.Line)
	assert.Nil(t, p.Sites["quay-south"].PUE, "what is not said is not known")
	assert.Equal(t, []any{"quad", 4.0, to[unit.Share](0.75), 4, to[unit.Power](240), to[unit.Power](2800), to[unit.Mass](1400e3), to(4 * unit.Year)},
		[]any{q.Name, q.Units, q.MeasuredShare, q.Meters, q.Idle, q.Rated, q.Embodied, q.Lifetime})
	assert.Nil(t, q.Unmetered)
	lone := p.Machines["lone"]
	assert.Equal(t, []any{1.0, to[unit.Power](320)}, []any{lone.Units, lone.Unmetered}, "a machine of one piece has one unit")
	assert.Nil(t, lone.MeasuredShare)
}

func TestSampleRules(t *testing.T) {
	p := policyOf(t, sample)
	j, b, r, w := p.Jobs[0], p.Budgets[0], p.Regressions[0], p.Waivers[0]
	assert.Equal(t, []any{"retrain-tide", "training", true, []string{"tide/**", "requirements.lock"}, []string{"quay-north", "quay-south"}, []string{"quad"}},
		[]any{j.Name, j.Stage, j.Required, j.Paths, j.Sites, j.Machines})
	assert.Equal(t, []any{&unit.Work{Amount: 100000, Unit: "step"}, "15 2 * * *", to(unit.Day), true, to(2.0), to(5 * unit.Minute), to(30 * unit.Minute), to(0.05)},
		[]any{j.Work, j.Schedule, j.Window, j.Interruptible, j.Stretch, j.Slot, j.MinSlice, j.ResumeKWh})
	assert.Equal(t, []any{"main, month", "main", "**", "**", budget.Limit{Mass: to[unit.Mass](40e3)}, "month", to[unit.Share](0.8), "warn"},
		[]any{b.Name, b.Branch, b.Job, b.Stage, b.Limit, b.Per, b.WarnAt, b.Landing})
	assert.Equal(t, []any{"main, no creep", "main", "**", "**", "total", unit.Share(0.05), "hold", "branch", 10, to[unit.Share](0.95)},
		[]any{r.Name, r.Branch, r.Job, r.Stage, r.Measure, r.MaxRise, r.Grid, r.Against, r.BaseRuns, r.Confidence})
	assert.Equal(t, []any{"main, month", 214, &budget.Limit{Mass: to[unit.Mass](3e3)}, "@quay-lead", toml.LocalDate{Year: 2031, Month: 4, Day: 1}},
		[]any{w.Rule, w.Pull, w.Extra, w.ApprovedBy, w.Expires})
	assert.Equal(t, []int{at(t, "[[job]]"), at(t, "[[budget]]"), at(t, "[[regression]]"), at(t, "[[waiver]]")}, []int{j.Line, b.Line, r.Line, w.Line})
}

// What a policy does not say has the values that the sample shows.
func TestDefaults(t *testing.T) {
	p := policyOf(t, "format = 1\n[[budget]]\nname = \"a\"\nlimit = \"1 kg\"\nper = \"run\"\n[[regression]]\nname = \"b\"\nmax_rise = \"5%\"\n")
	a, e := p.Account, p.Evidence
	assert.Equal(t, []any{grid.Average, "UTC", budget.Simple, "v*", budget.Uncertainty{}}, []any{a.Factor, a.Timezone, a.Decision, a.ReleaseTags, a.Uncertainty})
	assert.Equal(t, []any{2 * unit.Minute, unit.Share(0.95), 72 * unit.Hour, true, footprint.Averaged, "close"},
		[]any{e.MaxGap, e.MinCoverage, e.MaxAge, e.SameInputs, e.MinGrade, e.Unproven})
	assert.Equal(t, grid.Direct, p.Grid.Boundary)
	b, r := p.Budgets[0], p.Regressions[0]
	assert.Equal(t, []any{"**", "**", "**", "warn", (*unit.Share)(nil)}, []any{b.Branch, b.Job, b.Stage, b.Landing, b.WarnAt})
	assert.Equal(t, []any{"**", "**", "**", "total", "hold", "branch", 10}, []any{r.Branch, r.Job, r.Stage, r.Measure, r.Grid, r.Against, r.BaseRuns})
}
