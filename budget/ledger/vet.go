package ledger

import (
	"errors"
	"fmt"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/unit"
)

// vetting looks at all lines of a ledger that is kept as text, in the order of
// their booking.
type vetting struct {
	findings *finding.List
	force    force
	file     string
	no       int          // number of the line, from 1
	last     unit.Instant // when the line before it was booked
	none     bool         // there is no line before it
}

func newVetting() *vetting { return &vetting{findings: new(finding.List)} }

// page begins a file.
func (v *vetting) page(file string) { v.file, v.no, v.none = file, 0, true }

// add adds a finding about the line at hand.
func (v *vetting) add(what, do string) {
	v.findings.Add(finding.Finding{File: v.file, Line: v.no, What: what, Do: do})
}

// line takes the next line of the file.
func (v *vetting) line(text []byte) {
	v.no++
	l, err := parse(text)
	switch {
	case errors.Is(err, errKind):
		v.add(fmt.Sprintf("the line %s", err), "use the version of budgetcheck that wrote it, or a newer one")
		return
	case err != nil:
		v.findings.Add(unreadable(v.file, v.no, err))
		return
	}
	v.order(l)
	if l.entry != nil {
		v.entry(l.entry)
	}
}

// order checks what seeking in the file rests on.
func (v *vetting) order(l line) {
	const do = "put the file back from a copy: runs may be missed where lines are not in order of booking"
	if !v.none && l.booked < v.last {
		v.add(fmt.Sprintf("booked_at goes back from %s to %s", v.last, l.booked), do)
	}
	v.none, v.last = false, max(v.last, l.booked)
	if l.entry != nil && l.booked < l.entry.End {
		v.add(fmt.Sprintf("run %s was booked at %s, before it ended at %s", clip(l.entry.Run.Run), l.booked, l.entry.End), do)
	}
	if l.mark != nil && l.booked < l.mark.At {
		v.add(fmt.Sprintf("release %s was booked at %s, before its time %s", clip(l.mark.Tag), l.booked, l.mark.At), do)
	}
}

// entry checks that the entry had to be let in.
func (v *vetting) entry(e *Entry) {
	switch a := answer(e, v.force.get(e.Key())); a {
	case Already:
		v.add(fmt.Sprintf("%s is there twice", e.Key()), "nothing: the first one counts")
	case Refused:
		v.add(fmt.Sprintf("%s is there twice with different content, and neither corrects the other", e.Key()),
			"book a correction of the first one, which counts, if it is the wrong one")
	case Unfounded:
		v.add(fmt.Sprintf("%s corrects entry %s, which is not in force", e.Key(), clip(e.Corrects)),
			"book a correction of the entry that is in force")
	}
	v.force.add(e)
}
