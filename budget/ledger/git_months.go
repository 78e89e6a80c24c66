package ledger

import (
	"bytes"
	"iter"
	"regexp"
	"slices"

	"budgetcheck/budget/unit"
)

// month names the file of a moment. Names are in order of time.
func month(at unit.Instant) string { return at.Time().Format("2006-01") + ".ndjson" }

var monthName = regexp.MustCompile(`^\d{4}-\d{2}\.ndjson$`)

// months are the files from a name on, in order.
func (t *tip) months(from string) (names []string) {
	for _, f := range t.files {
		if f.name >= from && monthName.MatchString(f.name) {
			names = append(names, f.name)
		}
	}
	slices.Sort(names)
	return names
}

// lines are the lines of a text, without newlines.
func lines(text []byte) iter.Seq[[]byte] {
	return func(yield func([]byte) bool) {
		for one := range bytes.Lines(text) {
			if !yield(bytes.TrimSuffix(one, []byte("\n"))) {
				return
			}
		}
	}
}
