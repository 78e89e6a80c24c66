package record

import (
	"fmt"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/unit"
)

// order holds what the lines of one record must agree on with one another.
type order struct {
	open     *Open
	refused  bool // there was no good open line first; said once
	closed   bool
	latest   unit.Instant // the latest time on any line
	latestNo int
	usedEnd  unit.Instant
	usedNo   int
	work     *Work
	workAt   unit.Instant
	repeats  int
	meters   meters
}

// place checks that a line stands between open and close and not before the
// open line's time.
func (o *order) place(l *Line) *finding.Finding {
	switch {
	case o.open == nil && o.refused:
		return &finding.Finding{What: "no open line stands before this line", Do: "mend the open line"}
	case o.open == nil:
		o.refused = true
		return &finding.Finding{What: fmt.Sprintf("the first line is of kind %s", l.Kind), Do: "write an open line first"}
	case o.closed:
		return &finding.Finding{What: "a line after the close line", Do: "write close last, and one record a file"}
	case l.Kind != KindUsed && l.At < o.open.At:
		return &finding.Finding{What: fmt.Sprintf("%s is before the record opens at %s", l.At, o.open.At), Do: "open the record before its first line"}
	}
	return nil
}

// rare checks the lines that are few.
func (o *order) rare(l *Line) (wrong *finding.Finding, counts bool) {
	if l.Kind == KindOpen {
		return o.opens(l)
	}
	if wrong := o.place(l); wrong != nil {
		return wrong, false
	}
	switch l.Kind {
	case KindUsed:
		wrong = o.used(l)
	case KindWork:
		wrong = o.progress(l)
	case KindClose:
		wrong = o.closes(l)
	}
	if wrong == nil && l.Kind != KindUsed {
		o.seen(l.At, l.No)
	}
	return wrong, wrong == nil
}

func (o *order) opens(l *Line) (*finding.Finding, bool) {
	if o.open != nil {
		return &finding.Finding{What: "a second open line", Do: "write each part of each run to a file of its own"}, false
	}
	if o.refused {
		return &finding.Finding{What: "the open line is not the first line", Do: "write it first"}, false
	}
	o.open = l.Open
	o.seen(l.At, l.No)
	return nil, true
}

func (o *order) used(l *Line) *finding.Finding {
	u := l.Used
	switch {
	case u.From < o.open.At:
		return &finding.Finding{What: fmt.Sprintf("the total starts at %s, before the record opens at %s", u.From, o.open.At), Do: "open the record before it"}
	case o.usedNo > 0 && u.From < o.usedEnd:
		return &finding.Finding{What: fmt.Sprintf("the total from %s overlaps or precedes that of line %d, which ends at %s", u.From, o.usedNo, o.usedEnd),
			Do: "write totals in time order, each span once"}
	}
	o.usedEnd, o.usedNo = u.To, l.No
	l.At = u.To
	o.seen(u.To, l.No)
	return nil
}

func (o *order) progress(l *Line) *finding.Finding {
	w := l.Work
	if last := o.work; last != nil {
		switch {
		case l.At < o.workAt:
			return &finding.Finding{What: fmt.Sprintf("work goes back in time, from %s to %s", o.workAt, l.At), Do: "write work lines in time order"}
		case w.Unit != last.Unit:
			return &finding.Finding{What: fmt.Sprintf("work is told in %s and in %s", quote(last.Unit), quote(w.Unit)), Do: "use one unit in a record"}
		case w.Done < last.Done:
			return &finding.Finding{What: fmt.Sprintf("work done falls from %v to %v", last.Done, w.Done), Do: "write the work done since the start of the run"}
		case w.OfPart != last.OfPart:
			return &finding.Finding{What: `"of" changes within the record`, Do: "write run or part on every work line"}
		}
	}
	o.work, o.workAt = w, l.At
	return nil
}

// closes refuses a close before the latest line: such stop stamps are often
// copies of the start, and the run's end would be a guess.
func (o *order) closes(l *Line) *finding.Finding {
	if l.At < o.latest {
		return &finding.Finding{What: fmt.Sprintf("the record closes at %s, before line %d at %s", l.At, o.latestNo, o.latest),
			Do: "write the time at which the job ended"}
	}
	o.closed = true
	return nil
}

func (o *order) seen(at unit.Instant, no int) {
	if at > o.latest || o.latestNo == 0 {
		o.latest, o.latestNo = at, no
	}
}
