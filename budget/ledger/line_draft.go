package ledger

import (
	"bytes"
	"encoding/json"
	"fmt"
	"time"

	"budgetcheck/budget/unit"
)

// draft works out what a booking enters. It is given the lines that may be of
// the same keys, and then settles.
type draft struct {
	entries []*Entry // to be booked; copies, for what is handed in stays the caller's
	marks   []*Mark
	runs    map[string]bool  // whose entries may be of the same keys
	force   force            // what the ledger holds of these runs
	page    map[*Entry]*page // where an entry in force stands
	known   map[Mark]bool    // of the ledger
}

// page is a file of the ledger, or what is to be appended to it.
type page struct {
	name  string
	last  unit.Instant // when its last line was booked
	lines []line       // to be appended
}

// newDraft refuses what could not be read again.
func newDraft(entries []*Entry, marks []*Mark) (*draft, error) {
	d := &draft{runs: map[string]bool{}, page: map[*Entry]*page{}, known: map[Mark]bool{}}
	for _, e := range entries {
		c := *e
		c.Kind = KindRun
		if err := c.check(); err != nil {
			return nil, fmt.Errorf("an entry cannot be booked: it %w", err)
		}
		if _, err := json.Marshal(&c); err != nil {
			return nil, fmt.Errorf("the entry of %s cannot be booked: %w", c.Key(), err)
		}
		d.entries = append(d.entries, &c)
		d.runs[c.Run.Run] = true
	}
	for _, m := range marks {
		c := *m
		c.Kind = KindRelease
		d.marks = append(d.marks, &c)
	}
	return d, nil
}

// empty tells whether there is nothing to book.
func (d *draft) empty() bool { return len(d.entries)+len(d.marks) == 0 }

// since is where the ledger has to be read from. What an entry could collide
// with was booked after its run had ended, and so after the entry's own start.
func (d *draft) since() unit.Instant {
	since := unit.At(time.Date(2262, 1, 1, 0, 0, 0, 0, time.UTC))
	for _, e := range d.entries {
		since = min(since, e.Start)
	}
	for _, m := range d.marks {
		since = min(since, m.At)
	}
	return since
}

// read takes a line of the ledger. One that cannot be read is of no key.
func (d *draft) read(text []byte, p *page) {
	if h, sure := scanHead(text); sure && !d.runs[string(h.run)] {
		return
	}
	l, err := parse(text)
	switch {
	case err != nil:
	case l.mark != nil:
		d.known[*l.mark] = true
	case d.runs[l.entry.Run.Run]:
		d.force.add(l.entry)
		d.page[l.entry] = p
	}
}

// settle answers for each entry and puts those that go in on their pages. find
// gives the page for a moment that is not before another page.
func (d *draft) settle(find func(at unit.Instant, after *page) *page) []Answer {
	answers := make([]Answer, len(d.entries))
	for n, e := range d.entries {
		old := d.force.get(e.Key())
		if answers[n] = answer(e, old); answers[n].entered() {
			d.enter(e, find(e.End, d.page[old]))
		}
	}
	for _, m := range d.marks {
		if p := find(m.At, nil); !d.known[*m] {
			d.known[*m] = true
			p.last = max(p.last, m.At)
			p.lines = append(p.lines, line{mark: m, booked: p.last})
		}
	}
	return answers
}

func (d *draft) enter(e *Entry, p *page) {
	e.BookedAt = max(e.BookedAt, e.End, p.last)
	p.last = e.BookedAt
	p.lines = append(p.lines, line{entry: e, booked: e.BookedAt})
	d.force.add(e)
	d.page[e] = p
}

// text is what is to be appended to the page.
func (p *page) text() []byte {
	var b bytes.Buffer
	for _, l := range p.lines {
		b.Write(l.append(nil))
	}
	return b.Bytes()
}
