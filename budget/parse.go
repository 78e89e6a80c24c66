package budget

import (
	"maps"
	"reflect"
	"slices"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

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
