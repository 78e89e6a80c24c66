// Package finding holds what is wrong with somebody's input, as values: where,
// what, and what to do about it. A finding does not stop the reading; a failure
// of the machine is an error instead.
package finding

import (
	"cmp"
	"fmt"
	"slices"
)

// Finding is one thing wrong in an input.
type Finding struct {
	File string // as the user named it; empty where no file is concerned
	Line int    // from 1; 0 where no line is concerned
	What string // what is wrong
	Do   string // what to do
}

// String is "file:line: what is wrong; what to do".
func (f Finding) String() string {
	text := f.What
	if f.Do != "" {
		text += "; " + f.Do
	}
	switch {
	case f.File == "":
		return text
	case f.Line == 0:
		return f.File + ": " + text
	}
	return fmt.Sprintf("%s:%d: %s", f.File, f.Line, text)
}

// Kept is how many findings of one input are listed; the rest is counted.
const Kept = 20

// List collects the findings of one input. Its size is bounded: the first Kept
// are kept, the rest counted. The zero value is empty.
type List struct {
	kept []Finding
	more int
}

// Add appends a finding.
func (l *List) Add(f Finding) {
	if len(l.kept) < Kept {
		l.kept = append(l.kept, f)
		return
	}
	l.more++
}

// Join adds what another list of the same input has beyond this one.
func (l *List) Join(o *List) {
	for _, f := range o.kept {
		if !slices.Contains(l.kept, f) {
			l.Add(f)
		}
	}
	l.more = max(l.more, o.more)
}

// Len is how many findings were added.
func (l *List) Len() int { return len(l.kept) + l.more }

// First is the first finding; the list must not be empty.
func (l *List) First() Finding { return l.kept[0] }

// Lines are the findings in order of file and line, without doubles, and a
// last line that counts those not kept.
func (l *List) Lines() []string {
	sorted := slices.Clone(l.kept)
	slices.SortStableFunc(sorted, func(a, b Finding) int {
		return cmp.Or(cmp.Compare(a.File, b.File), cmp.Compare(a.Line, b.Line))
	})
	var lines []string
	for i, f := range sorted {
		if !slices.Contains(sorted[:i], f) {
			lines = append(lines, f.String())
		}
	}
	if l.more > 0 {
		more := Finding{File: l.kept[0].File, What: fmt.Sprintf("%d more like these", l.more)}
		lines = append(lines, more.String())
	}
	return lines
}
