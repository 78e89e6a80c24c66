package budget_test

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// Each edit of the sample is one mistake, told at its line with what is wrong
// and what to do.
var mistakes = []struct{ old, new, what, do string }{
	// What cannot be read as a value of its kind.
	{`format = 1`, `format = "1"`, "format is 1", "write a whole number"},
	{`format = 1`, `format = 1.5`, "format is 1.5", "write a whole number"},
	{`timezone = "UTC"`, `timezone = 1`, "account.timezone is 1", "write a text in quotation marks"},
	{`max_gap = "2m"`, `max_gap = 2`, `evidence.max_gap: "2" is not a duration`, "use one of ms, s, min, h, d, y"},
	{`max_gap = "2m"`, `max_gap = ["2m"]`, "evidence.max_gap is not a text", "write it in quotation marks"},
	{`min_coverage = 0.95`, `min_coverage = "most"`, `evidence.min_coverage: "most" is not a share`, "write it like"},
	{`min_coverage = 0.95`, `min_coverage = -0.95`, "below zero", "write it like"},
	{`max_age = "72h"`, `max_age = "3 moons"`, `unknown unit "moons"`, "use one of"},
	{`same_inputs = true`, `same_inputs = "true"`, "evidence.same_inputs is true", "write a bare true or false"},
	{`series = ["grid/*.csv"]`, `series = "grid/*.csv"`, "grid.series is not a list", "write it as a list"},
	{`series = ["grid/*.csv"]`, `series = [7]`, "grid.series is 7", "write a text in quotation marks"},
	{`pue = 1.18`, `pue = "1.18"`, "site.quay-north.pue is 1.18", "write a number"},
	{`annual = "412 g/kWh"`, `annual = "412 g"`, `unknown unit "g"`, "use one of g/kWh"},
	{`annual = "412 g/kWh"`, `annual = 412`, "it has no unit", "use one of g/kWh"},
	{`units = 4`, `units = "four"`, "machine.quad.units is four", "write a number"},
	{`meters = 4 `, `meters = 4.5 `, "machine.quad.meters is 4.5", "write a whole number"},
	{`idle = "240 W"`, `idle = "240 kg"`, `unknown unit "kg"`, "use one of"},
	{`embodied = "1400 kg"`, `embodied = "1400 kWh"`, `"1400 kWh" is not a mass`, "use one of"},
	{`required = true`, `required = 1`, "job.required is 1", "write a bare true or false"},
	{`work = "100000 step"`, `work = "100000"`, `"100000" is not an amount of work`, "write a number above zero and one word"},
	{`window = "24h"`, `window = true`, `job.window: "true" is not a duration`, "write it like"},
	{`expires = 2031-04-01`, `expires = "2031-04-01"`, "waiver.expires is not a date", "write a date without quotation marks"},
	{`expires = 2031-04-01`, `expires = 2031-04-01T00:00:00Z`, "waiver.expires is not a date", "write a date without quotation marks"},
	{`pull = 214`, `pull = "214"`, "waiver.pull is 214", "write a whole number"},
	{`uncertainty = { meter = "2%", share = "5%", pue = "3%", intensity = "8%", embodied = "30%" }`, `uncertainty = "5%"`, "account.uncertainty is not a table", "write it as a table"},

	// Limits are masses, energies or rates.
	{`limit = "40 kg"`, `limit = "40"`, "it has no unit", "a limit may also be an energy"},
	{`limit = "40 kg"`, `limit = "40 kW"`, `unknown unit "kW"`, "a limit may also be an energy"},
	{`limit = "40 kg"`, `limit = "-40 kg"`, "below zero", "write it like"},
	{`limit = "40 kg"`, `limit = "1.2 g per 1000"`, `"1.2 g per 1000" is not a rate`, "write a number above zero and one word"},
	{`limit = "40 kg"`, `limit = "1.2 kWh per step"`, `"1.2 kWh per step" is not a rate`, "use one of"},
	{`limit = "40 kg"`, `limit = "1 g per 0 step"`, `"1 g per 0 step" is not a rate`, "above zero"},

	// Words.
	{`factor   = "average"`, `factor   = "averge"`, `account.factor is "averge"`, "write one of average, marginal; did you mean average?"},
	{`decision = "simple"`, `decision = "guard"`, `account.decision is "guard"`, "did you mean guarded?"},
	{`min_grade = "averaged"`, `min_grade = "guessed"`, `evidence.min_grade is "guessed"`, "write one of measured, filled, averaged, estimated"},
	{`unproven = "close"`, `unproven = "ignore"`, `evidence.unproven is "ignore"`, "write one of close, warn"},
	{`boundary = "direct"`, `boundary = "scope 2"`, `grid.boundary is "scope 2"`, "write one of direct, lifecycle"},
	{`market_basis = "residual"`, `market_basis = "rest"`, `site.quay-north.market_basis is "rest"`, "write one of contract, supplier, residual"},
	{`per = "month"`, `per = "moon"`, `budget.per is "moon"`, "write one of run, pull, day, week, month, quarter, year, release"},
	{`landing = "warn"`, `landing = "open"`, `budget.landing is "open"`, "write one of warn, close"},
	{`measure = "total"`, `measure = "mass"`, `regression.measure is "mass"`, "write one of total, rate, energy"},
	{`grid = "hold"`, `grid = "held"`, `regression.grid is "held"`, "did you mean hold?"},
	{`against = "branch"`, `against = "main"`, `regression.against is "main"`, "write one of branch, release"},

	// Out of range.
	{`format = 1`, `format = 2`, "format is 2", "this version reads format 1"},
	{`timezone = "UTC"`, `timezone = "Harbour/Mole"`, `account.timezone "Harbour/Mole" is not known`, "from the time zone database"},
	{`timezone = "UTC"`, `timezone = "Local"`, `account.timezone "Local" is not known`, "write UTC"},
	{`timezone = "UTC"`, `timezone = ""`, `account.timezone "" is not known`, "write UTC"},
	{`release_tags = "v*"`, `release_tags = "v["`, `the glob "v["`, "write a glob"},
	{`meter = "2%"`, `meter = "200%"`, "account.uncertainty has a value of 200 %", "standard uncertainties"},
	{`max_gap = "2m"`, `max_gap = "0s"`, "evidence.max_gap is 0 s", "above zero"},
	{`max_age = "72h"`, `max_age = "0h"`, "evidence.max_age is 0 s", "above zero"},
	{`min_coverage = 0.95`, `min_coverage = 95`, "evidence.min_coverage is 9500 %", "up to 1"},
	{`series = ["grid/*.csv"]`, `series = ["grid/[.csv"]`, `the glob "grid/[.csv"`, "write a glob"},
	{`zone = "NORTH"`, `zone = ""`, "site.quay-north.zone is empty", "write what it is"},
	{`pue = 1.18`, `pue = 0.99`, "the PUE of site quay-north is 0.99", "from 1 up"},
	{`pue = 1.18`, `pue = nan`, "the PUE of site quay-north is NaN", "from 1 up"},
	{`units = 4`, `units = 0`, "machine quad has 0 units", "how many units"},
	{`units = 4`, `units = inf`, "machine quad has +Inf units", "how many units"},
	{`measured_share = 0.75`, `measured_share = 0`, "the measured_share of machine quad is 0 %", "above 0, up to 1"},
	{`measured_share = 0.75`, `measured_share = 1.01`, "the measured_share of machine quad is 101 %", "above 0, up to 1"},
	{`meters = 4 `, `meters = -4 `, "machine quad has -4 meters", "how many meters"},
	{`idle = "240 W"`, `idle = "2.8 kW"`, "machine quad has idle 2.80 kW and rated 2.80 kW", "write the smaller power as idle"},
	{`lifetime = "4y"`, `lifetime = "0y"`, "machine quad has a lifetime of 0 s", "above zero"},
	{`paths = ["tide/**", "requirements.lock"]`, `paths = ["tide/**", "{"]`, `the glob "{"`, "write a glob"},
	{`sites = ["quay-north", "quay-south"]`, `sites = ["quay-nort"]`, `site "quay-nort" is not in the policy`, "add [site.quay-nort], or use one of [quay-north, quay-south]; did you mean quay-north?"},
	{`machines = ["quad"]`, `machines = ["quads"]`, `machine "quads" is not in the policy`, "did you mean quad?"},
	{`work = "100000 step"`, `work = "0 step"`, `"0 step" is not an amount of work`, "above zero"},
	{`schedule = "15 2 * * *"`, `schedule = "15 2 * *"`, "the schedule of job retrain-tide cannot be read", "write five cron fields"},
	{`schedule = "15 2 * * *"`, `schedule = "75 2 * * *"`, "the schedule of job retrain-tide cannot be read", "write five cron fields"},
	{`schedule = "15 2 * * *"`, `schedule = "CRON_TZ=Harbour/Mole 15 2 * * *"`, "the schedule of job retrain-tide cannot be read", "write five cron fields"},
	{`schedule = "15 2 * * *"`, `schedule = "CRON_TZ=UTC"`, "no fields follow the time zone", "write five cron fields"},
	{`schedule = "15 2 * * *"`, `schedule = "TZ="`, "no fields follow the time zone", "write five cron fields"},
	{`stretch = 2.0`, `stretch = 0.5`, "the stretch of job retrain-tide is 0.5", "from 1 up"},
	{`stretch = 2.0`, `stretch = inf`, "the stretch of job retrain-tide is +Inf", "from 1 up"},
	{`slot = "5m"`, `slot = "0m"`, "the slot of job retrain-tide is 0 s", "above zero"},
	{`resume_kwh = 0.05`, `resume_kwh = -0.05`, "the resume_kwh of job retrain-tide is -0.05", "from 0 up"},
	{`resume_kwh = 0.05`, `resume_kwh = inf`, "the resume_kwh of job retrain-tide is +Inf", "from 0 up"},
	{`warn_at = 0.8`, `warn_at = 0`, `the warn_at of "main, month" is 0 %`, "above 0, up to 1"},
	{`warn_at = 0.8`, `warn_at = "101%"`, `the warn_at of "main, month" is 101 %`, "above 0, up to 1"},
	{`base_runs = 10`, `base_runs = 2`, `the base_runs of "main, no creep" is 2`, "write 3 or more"},
	{`confidence = 0.95`, `confidence = 1`, `the confidence of "main, no creep" is 100 %`, "between 0.5 and 1"},
	{`confidence = 0.95`, `confidence = 0.5`, `the confidence of "main, no creep" is 50.0 %`, "between 0.5 and 1"},
	{`rule = "main, month"`, `rule = "main, months"`, `the waiver names rule "main, months", which is not there`, "did you mean main, month?"},
	{`pull = 214`, `pull = -214`, "the pull of a waiver is -214", "the number of the pull request"},
	{`reason = "one-off backfill after the gauge was recalibrated"`, `reason = ""`, "waiver.reason is empty", "write what it is"},
	{`name = "retrain-tide"`, `name = ""`, "job.name is empty", "write what it is"},
}

func TestMistakes(t *testing.T) {
	for _, m := range mistakes {
		t.Run(m.new, func(t *testing.T) {
			text := edit(t, sample, m.old, m.new)
			found := findings(text)
			require.Len(t, found, 1)
			f := found[0]
			assert.Equal(t, []any{"budgetcheck.toml", lineOf(t, sample, m.old)}, []any{f.File, f.Line})
			assert.Contains(t, f.What, m.what)
			assert.Contains(t, f.Do, m.do)
		})
	}
}

// Keys that go together are told at one of them.
func TestPairs(t *testing.T) {
	cases := []struct{ old, new, line, want string }{
		{"market = \"305 g/kWh\"", "#", "market_basis", "site quay-north has only one of market and market_basis; write both or neither"},
		{"market_basis = ", "#", "market = ", "site quay-north has only one of market and market_basis; write both or neither"},
		{"lifetime = ", "#", "embodied = \"1400 kg\"", "machine quad has only one of embodied and lifetime; write both or neither"},
		{"embodied = \"1400 kg\"", "#", "lifetime = ", "machine quad has only one of embodied and lifetime; write both or neither"},
		{"meters = 4", "unmetered = \"1 W\"\nmeters = 4", "unmetered = \"1 W\"", "machine quad has both measured_share and unmetered; keep one of them"},
	}
	for _, c := range cases {
		text := edit(t, sample, c.old, c.new)
		found := findings(text)
		require.Len(t, found, 1, c.want)
		f := found[0]
		assert.Equal(t, []any{lineOf(t, text, c.line), c.want}, []any{f.Line, f.What + "; " + f.Do})
	}
}

// A key that has to be there is missed at its table's line.
func TestMissingKeys(t *testing.T) {
	const head = "format = 1\n\n"
	cases := []struct{ text, want string }{
		{"\n", "budgetcheck.toml: the policy has no format; add it"},
		{head + "[site.quay-north]\n", "budgetcheck.toml:3: site.quay-north has no zone; add it"},
		{head + "[[job]]\nstage = \"x\"\n", "budgetcheck.toml:3: job has no name; add it"},
		{head + "[[budget]]\nlimit = \"1 kg\"\nper = \"run\"\n", "budgetcheck.toml:3: budget has no name; add it"},
		{head + "[[budget]]\nname = \"a\"\nper = \"run\"\n", "budgetcheck.toml:3: budget has no limit; add it"},
		{head + "[[budget]]\nname = \"a\"\nlimit = \"1 kg\"\n", "budgetcheck.toml:3: budget has no per; add it"},
		{head + "[[regression]]\nname = \"a\"\n", "budgetcheck.toml:3: regression has no max_rise; add it"},
	}
	for _, c := range cases {
		found := findings(c.text)
		require.Len(t, found, 1, c.want)
		assert.Equal(t, c.want, found[0].String())
	}
	waiver := findings(head + "[[regression]]\nname = \"a\"\nmax_rise = 0.1\n[[waiver]]\nrule = \"a\"\n")
	require.Len(t, waiver, 3)
	for n, key := range []string{"reason", "approved_by", "expires"} {
		assert.Equal(t, "budgetcheck.toml:6: waiver has no "+key+"; add it", waiver[n].String())
	}
}
