package budget

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"
	"time"

	"github.com/bmatcuk/doublestar/v4"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/forecast"
	"budgetcheck/budget/unit"
)

// checker reports what is wrong with values that could each be read.
type checker struct{ report func(finding.Finding) }

// refuse reports a key of a table; do says what to write instead.
func (c checker) refuse(p Place, key, do, format string, args ...any) {
	file, line := p.of(key)
	c.report(finding.Finding{File: file, Line: line, What: fmt.Sprintf(format, args...), Do: do})
}

// check looks at the policy as a whole.
func (p *Policy) check(report func(finding.Finding)) {
	c := checker{report}
	if p.Format != 1 {
		c.refuse(p.Place, "format", "this version reads format 1; write that, or use a newer budgetcheck", "format is %d", p.Format)
	}
	c.account(p.Account)
	c.evidence(p.Evidence)
	for n, glob := range p.Grid.Series {
		c.glob(p.Grid.item("series", n), "series", glob)
	}
	for _, name := range names(p.Sites) {
		c.site(p.Sites[name])
	}
	for _, name := range names(p.Machines) {
		c.machine(p.Machines[name])
	}
	c.jobs(p)
	c.rules(p)
}

func (c checker) account(a Account) {
	if _, err := time.LoadLocation(a.Timezone); err != nil || a.Timezone == "" || a.Timezone == "Local" {
		c.refuse(a.Place, "timezone", `write UTC or a name like "Etc/GMT-1" from the time zone database`, "account.timezone %q is not known", a.Timezone)
	}
	if !doublestar.ValidatePattern(a.ReleaseTags) {
		c.glob(a.Place, "release_tags", a.ReleaseTags)
	}
	u, declared := a.Uncertainty, false
	for _, v := range []*unit.Share{u.Meter, u.Share, u.PUE, u.Intensity, u.Embodied} {
		declared = declared || v != nil
		if v != nil && *v > 1 {
			c.refuse(a.Place, "uncertainty", `write relative standard uncertainties (k = 1), like "2%"`, "account.uncertainty has a value of %s", *v)
		}
	}
	if a.Decision == Guarded && !declared {
		c.refuse(a.Place, "decision", "declare account.uncertainty, or write simple", "account.decision is guarded but no uncertainty is declared")
	}
}

func (c checker) evidence(e Evidence) {
	if e.MaxGap <= 0 {
		c.refuse(e.Place, "max_gap", "write a duration above zero", "evidence.max_gap is %s", e.MaxGap)
	}
	if e.MaxAge <= 0 {
		c.refuse(e.Place, "max_age", "write a duration above zero", "evidence.max_age is %s", e.MaxAge)
	}
	if e.MinCoverage > 1 {
		c.refuse(e.Place, "min_coverage", "write a share up to 1", "evidence.min_coverage is %s", e.MinCoverage)
	}
}

func (c checker) site(s *Site) {
	if s.PUE != nil && !(*s.PUE >= 1 && *s.PUE <= 10) {
		c.refuse(s.Place, "pue", "write facility energy over IT energy, from 1 up", "the PUE of site %s is %v", s.Name, *s.PUE)
	}
	if (s.Market == nil) != (s.MarketBasis == "") {
		c.refuse(s.Place, s.either("market", "market_basis"), "write both or neither", "site %s has only one of market and market_basis", s.Name)
	}
}

func (c checker) machine(m *Machine) {
	if !(m.Units > 0) || math.IsInf(m.Units, 0) {
		c.refuse(m.Place, "units", "write how many units can be reserved", "machine %s has %v units", m.Name, m.Units)
	}
	if m.MeasuredShare != nil && m.Unmetered != nil {
		c.refuse(m.Place, "unmetered", "keep one of them", "machine %s has both measured_share and unmetered", m.Name)
	}
	if s := m.MeasuredShare; s != nil && (*s <= 0 || *s > 1) {
		c.refuse(m.Place, "measured_share", "write a share above 0, up to 1", "the measured_share of machine %s is %s", m.Name, *s)
	}
	if m.Meters < 0 {
		c.refuse(m.Place, "meters", "write how many meters a fully reserved machine has", "machine %s has %d meters", m.Name, m.Meters)
	}
	if m.Idle != nil && m.Rated != nil && *m.Idle >= *m.Rated {
		c.refuse(m.Place, "idle", "write the smaller power as idle", "machine %s has idle %s and rated %s", m.Name, *m.Idle, *m.Rated)
	}
	if (m.Embodied == nil) != (m.Lifetime == nil) {
		c.refuse(m.Place, m.either("embodied", "lifetime"), "write both or neither", "machine %s has only one of embodied and lifetime", m.Name)
	}
	if m.Lifetime != nil && *m.Lifetime <= 0 {
		c.refuse(m.Place, "lifetime", "write a duration above zero", "machine %s has a lifetime of %s", m.Name, *m.Lifetime)
	}
}

func (c checker) jobs(p *Policy) {
	seen := map[[2]string]bool{}
	for _, j := range p.Jobs {
		if id := [2]string{j.Name, j.Stage}; seen[id] || seen[[2]string{j.Name, ""}] {
			c.refuse(j.Place, "name", "write one table for each job and stage", "job %q stands twice", j.Name)
		} else {
			seen[id] = true
		}
		for n, s := range j.Sites {
			c.known(j.item("sites", n), "site", s, names(p.Sites))
		}
		for n, m := range j.Machines {
			c.known(j.item("machines", n), "machine", m, names(p.Machines))
		}
		for n, glob := range j.Paths {
			c.glob(j.item("paths", n), "paths", glob)
		}
		c.timing(j)
	}
}

func (c checker) timing(j *Job) {
	if j.Schedule != "" {
		if _, err := forecast.ParseSchedule(j.Schedule); err != nil {
			c.refuse(j.Place, "schedule", `write five cron fields, like "15 2 * * *"`, "the schedule of job %s cannot be read (%v)", j.Name, errors.Unwrap(err))
		}
	}
	if j.Stretch != nil && (!(*j.Stretch >= 1) || math.IsInf(*j.Stretch, 0)) {
		c.refuse(j.Place, "stretch", "write a number from 1 up", "the stretch of job %s is %v", j.Name, *j.Stretch)
	}
	if j.Slot != nil && *j.Slot <= 0 {
		c.refuse(j.Place, "slot", "write a duration above zero", "the slot of job %s is %s", j.Name, *j.Slot)
	}
	if j.ResumeKWh != nil && (!(*j.ResumeKWh >= 0) || math.IsInf(*j.ResumeKWh, 0)) {
		c.refuse(j.Place, "resume_kwh", "write an energy in kWh from 0 up", "the resume_kwh of job %s is %v", j.Name, *j.ResumeKWh)
	}
}

func (c checker) known(p Place, what, name string, known []string) {
	if !slices.Contains(known, name) {
		c.refuse(p, "", fmt.Sprintf("add [%s.%s], or use one of [%s]%s", what, name, strings.Join(known, ", "), nearest(name, known)), "%s %q is not in the policy", what, name)
	}
}

func (c checker) glob(p Place, key, glob string) {
	if glob == "" || !doublestar.ValidatePattern(glob) {
		c.refuse(p, key, "write a glob; ** crosses slashes", "%s has the glob %q, which cannot be read", key, glob)
	}
}

// rules checks budgets, regressions and waivers.
func (c checker) rules(p *Policy) {
	var rules []string
	named := func(place Place, name string, globs ...string) {
		if slices.Contains(rules, name) {
			c.refuse(place, "name", "give each rule a name of its own", "rule %q stands twice", name)
		}
		rules = append(rules, name)
		for i, key := range []string{"branch", "job", "stage"} {
			c.glob(place, key, globs[i])
		}
	}
	for _, b := range p.Budgets {
		named(b.Place, b.Name, b.Branch, b.Job, b.Stage)
		c.budget(b)
	}
	for _, r := range p.Regressions {
		named(r.Place, r.Name, r.Branch, r.Job, r.Stage)
		c.regression(r)
	}
	for _, w := range p.Waivers {
		if !slices.Contains(rules, w.Rule) {
			c.refuse(w.Place, "rule", "name a budget or a regression of this policy"+nearest(w.Rule, rules), "the waiver names rule %q, which is not there", w.Rule)
		}
		for _, b := range p.Budgets {
			if b.Name == w.Rule && w.Extra != nil && !b.Limit.alike(*w.Extra) {
				c.refuse(w.Place, "extra", "write it in the unit of the limit, like "+b.Limit.String(), "the extra of the waiver is %s, the limit of %q is %s", w.Extra, b.Name, b.Limit)
			}
		}
		for _, r := range p.Regressions {
			if r.Name == w.Rule && w.Extra != nil {
				c.refuse(w.Place, "extra", "leave it out, or change max_rise", "the waiver lifts the limit of %q, which is a regression", r.Name)
			}
		}
		if w.Pull < 0 {
			c.refuse(w.Place, "pull", "write the number of the pull request", "the pull of a waiver is %d", w.Pull)
		}
	}
}

func (c checker) budget(b *Budget) {
	if b.WarnAt != nil && (*b.WarnAt <= 0 || *b.WarnAt > 1) {
		c.refuse(b.Place, "warn_at", "write a share of the limit above 0, up to 1", "the warn_at of %q is %s", b.Name, *b.WarnAt)
	}
}

func (c checker) regression(r *Regression) {
	if r.BaseRuns < 3 {
		c.refuse(r.Place, "base_runs", "write 3 or more: fewer show no spread", "the base_runs of %q is %d", r.Name, r.BaseRuns)
	}
	if s := r.Confidence; s != nil && (*s <= 0.5 || *s >= 1) {
		c.refuse(r.Place, "confidence", "write a share between 0.5 and 1, like 0.95", "the confidence of %q is %s", r.Name, *s)
	}
}
