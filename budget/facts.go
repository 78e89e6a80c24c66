package budget

import (
	"fmt"
	"slices"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/record"
)

// Method is how the policy has runs weighed.
func (p *Policy) Method() footprint.Method {
	u := p.Account.Uncertainty
	return footprint.Method{
		Factor: p.Account.Factor, Boundary: p.Grid.Boundary,
		MaxGap: p.Evidence.MaxGap, MinCoverage: p.Evidence.MinCoverage,
		Uncertainty: footprint.Declared{Meter: u.Meter, Share: u.Share, PUE: u.PUE, Intensity: u.Intensity, Embodied: u.Embodied},
	}
}

// ColumnNames is how the policy maps the columns of series files.
func (g Grid) ColumnNames() grid.Columns {
	c := g.Columns
	return grid.Columns{Zone: c.Zone, From: c.From, To: c.To, GPerKWh: c.GPerKWh, Factor: c.Factor}
}

// Weigh makes one pass over a record with the policy's facts and the series.
func (p *Policy) Weigh(src footprint.Source, set *grid.Set) (*footprint.Part, error) {
	return footprint.Weigh(src, p.Method(), func(o *record.Open) footprint.Facts { return p.facts(o, set) })
}

// facts looks a part's site and machine up.
func (p *Policy) facts(o *record.Open, set *grid.Set) (f footprint.Facts) {
	if p.bare {
		return bareFacts(o, p.Account.Factor, set)
	}
	if s := p.Sites[o.Site]; s != nil {
		f.Site = &footprint.Site{Name: s.Name, Zone: s.Zone, PUE: 1, Annual: s.Annual, Market: s.Market,
			Series: set.Series(s.Zone, p.Account.Factor), Broken: set.Broken(s.Zone)}
		if s.PUE != nil {
			f.Site.PUE = *s.PUE
		} else {
			f.Assumed = append(f.Assumed, fmt.Sprintf("site %s declares no PUE: 1 is taken", s.Name))
		}
	}
	if m := p.Machines[o.Machine]; m != nil {
		f.Machine = &footprint.Machine{Name: m.Name, Units: m.Units, MeasuredShare: 1, Unmetered: m.Unmetered, Meters: m.Meters,
			Idle: m.Idle, Rated: m.Rated, Embodied: m.Embodied, Lifetime: m.Lifetime}
		switch {
		case m.MeasuredShare != nil:
			f.Machine.MeasuredShare = *m.MeasuredShare
		case m.Unmetered == nil:
			f.Assumed = append(f.Assumed, fmt.Sprintf("machine %s declares no measured_share: 1 is taken", m.Name))
		}
	}
	return f
}

// bareFacts takes a record's site as its zone and its machine as fully seen by
// its meters. What is reserved does not matter without embodied emissions.
func bareFacts(o *record.Open, factor grid.Factor, set *grid.Set) footprint.Facts {
	return footprint.Facts{
		Site:    &footprint.Site{Name: o.Site, Zone: o.Site, PUE: 1, Series: set.Series(o.Site, factor), Broken: set.Broken(o.Site)},
		Machine: &footprint.Machine{Name: o.Machine, Units: max(o.Reserved, 1), MeasuredShare: 1},
		Assumed: []string{"no policy: the site is taken as the grid zone, with PUE 1, measured share 1 and no embodied emissions"},
	}
}

// Knows tells whether the policy has a job of this name.
func (p *Policy) Knows(job string) bool {
	return slices.ContainsFunc(p.Jobs, func(j *Job) bool { return j.Name == job })
}

// job is the policy's job for a run; nil if it does not know one.
func (p *Policy) job(name, stage string) *Job {
	for _, j := range p.Jobs {
		if j.Name == name && (j.Stage == "" || j.Stage == stage) {
			return j
		}
	}
	return nil
}
