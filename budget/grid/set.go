package grid

import (
	"cmp"
	"fmt"
	"maps"
	"slices"

	"budgetcheck/budget/finding"
)

// Set is all series that a policy names, of one boundary.
type Set struct {
	boundary Boundary
	files    []*File
	series   map[key]*Series
	notes    []string
	noted    map[key]bool // series for which a note says that files differ
}

// NewSet lays the files over one another in the given order: the same row
// twice is one row, and where rows differ the later file wins, which is noted
// once for each series.
func NewSet(boundary Boundary, files ...*File) *Set {
	set := &Set{boundary: boundary, files: files, series: map[key]*Series{}, noted: map[key]bool{}}
	for _, f := range files {
		for _, k := range sortedKeys(f.steps) {
			set.add(f, k)
		}
	}
	return set
}

func (set *Set) add(f *File, k key) {
	var steps []Interval
	for _, s := range f.steps[k] {
		steps = append(steps, s.Interval)
	}
	if len(steps) == 0 {
		return
	}
	s := set.series[k]
	if s == nil {
		set.series[k] = NewSeries(k.zone, k.factor, set.boundary, steps)
		return
	}
	merged, differs := overlay(s.steps, steps)
	if differs != nil && !set.noted[k] {
		set.noted[k] = true
		set.notes = append(set.notes, fmt.Sprintf("%s differs from an earlier file for zone %s (%s) from %s on; where files differ, the later one counts",
			f.Name, k.zone, k.factor, differs.From))
	}
	s.steps = merged
}

// Broken is the first row that could not be read and may have been of the
// zone; nil where every row that may concern it could. What a broken zone
// prices is not proven.
func (set *Set) Broken(zone string) *finding.Finding {
	for _, f := range set.files {
		if found, ok := f.broken[zone]; ok {
			return &found
		}
		if found, ok := f.broken[""]; ok && (len(f.zones) == 0 || f.zones[zone]) {
			return &found
		}
	}
	return nil
}

// Series is the series of a zone and factor, nil if there is none.
func (set *Set) Series(zone string, factor Factor) *Series {
	return set.series[key{zone, factor}]
}

// All are the series of the set in order of zone and factor.
func (set *Set) All() []*Series {
	var all []*Series
	for _, k := range sortedKeys(set.series) {
		all = append(all, set.series[k])
	}
	return all
}

// Notes tell where files differed.
func (set *Set) Notes() []string { return set.notes }

func sortedKeys[V any](m map[key]V) []key {
	return slices.SortedFunc(maps.Keys(m), func(a, b key) int {
		return cmp.Or(cmp.Compare(a.zone, b.zone), cmp.Compare(a.factor, b.factor))
	})
}
