package report

import (
	"fmt"
	"strings"

	"budgetcheck/budget/footprint"
)

// allNotes are the statement's notes and those of its runs, each once, with
// the runs that it is about.
func allNotes(notes []string, runs []*footprint.Run) []string {
	lines := append([]string(nil), notes...)
	about := map[string][]string{}
	var order []string
	for _, r := range runs {
		for _, n := range append(r.Notes[:len(r.Notes):len(r.Notes)], oneBook(r)...) {
			if about[n] == nil {
				order = append(order, n)
			}
			about[n] = append(about[n], name(r))
		}
	}
	for _, n := range order {
		lines = append(lines, whose(about[n], len(runs))+": "+n)
	}
	return lines
}

// oneBook says where a run has no market-based figure beside its
// location-based one (GHG Protocol Scope 2 Guidance, dual reporting).
func oneBook(r *footprint.Run) []string {
	if r.Facility == nil || r.Market != nil {
		return nil
	}
	return []string{"not dual-reported: no market-based factor is declared for its site"}
}

// whose names the runs of a note: all of them, or the first few.
func whose(names []string, all int) string {
	const few = 3
	switch {
	case len(names) == all && all > 1:
		return "all runs"
	case len(names) == 1:
		return "run " + names[0]
	case len(names) <= few:
		return "runs " + strings.Join(names, ", ")
	}
	return fmt.Sprintf("runs %s and %d more", strings.Join(names[:few], ", "), len(names)-few)
}
