package ledger

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"maps"

	"budgetcheck/budget/record"
)

// ID is the hash of the entry's content, by which a correction names it.
func (e *Entry) ID() string {
	text, err := json.Marshal(e)
	if err != nil { // figures are finite, the rest are texts
		panic(err)
	}
	sum := sha256.Sum256(text)
	const enough = 16
	return hex.EncodeToString(sum[:enough])
}

// same tells whether two entries of a key tell of the same record. Its weight
// may differ: facts and prices are those of the day on which it was booked.
func (e *Entry) same(o *Entry) bool {
	return e.Digest == o.Digest && e.Closed == o.Closed && e.Outcome == o.Outcome && e.Start == o.Start && e.End == o.End &&
		e.Job == o.Job && e.Stage == o.Stage && e.Of == o.Of && e.work() == o.work() &&
		maps.Equal(e.Labels, o.Labels) && e.place() == o.place()
}

// work is the entry's work by value, as it is written: WorkOfPart tells whose
// it is.
func (e *Entry) work() record.Work {
	if e.Work == nil {
		return record.Work{}
	}
	return record.Work{Unit: e.Work.Unit, Done: e.Work.Done, Planned: e.Work.Planned, OfPart: e.WorkOfPart}
}

type place struct {
	host, site, machine string
	reserved            float64
}

func (e *Entry) place() place {
	if len(e.Parts) == 0 {
		return place{}
	}
	p := e.Parts[0]
	return place{p.Host, p.Site, p.Machine, p.Reserved}
}

// succeeds tells whether e may stand in for o, an entry of its key: o's job
// had not closed its record, and e has more of it.
func (e *Entry) succeeds(o *Entry) bool {
	return !o.Closed && e.Corrects == "" && e.Start == o.Start && (e.End > o.End || e.End == o.End && e.Closed)
}

// answer decides what becomes of e, where inForce is the entry of its key that
// is in force, nil if there is none.
func answer(e, inForce *Entry) Answer {
	switch {
	case e.Corrects != "" && inForce == nil:
		return Unfounded
	case e.Corrects != "" && inForce.Corrects == e.Corrects && e.same(inForce) && e.equal(inForce):
		return Already
	case e.Corrects != "" && inForce.ID() != e.Corrects:
		return Unfounded
	case e.Corrects != "" || inForce == nil:
		return Booked
	case e.same(inForce) || inForce.succeeds(e):
		return Already // also where less of a record comes after more of it
	case e.succeeds(inForce):
		return Longer
	}
	return Refused
}

// equal compares weights: of a correction, they are what it is about.
func (e *Entry) equal(o *Entry) bool {
	a, b := *e, *o
	a.BookedAt, b.BookedAt = 0, 0
	return a.ID() == b.ID()
}

// entered tells whether an entry with this answer goes into the books.
func (a Answer) entered() bool { return a == Booked || a == Longer }

// force keeps of each key the entry in force. Lines come in the order in which
// they were booked; what was let in when it was booked is trusted, for what it
// stands in for may not have been read.
type force struct {
	at   map[Key]int
	list []*Entry
}

// get is the entry of the key that is in force so far; nil if there is none.
func (f *force) get(k Key) *Entry {
	if n, ok := f.at[k]; ok {
		return f.list[n]
	}
	return nil
}

// add takes the next entry.
func (f *force) add(e *Entry) {
	if f.at == nil {
		f.at = map[Key]int{}
	}
	k := e.Key()
	switch n, known := f.at[k]; {
	case !known:
		f.at[k] = len(f.list)
		f.list = append(f.list, e)
	case e.Corrects != "" || e.succeeds(f.list[n]):
		f.list[n] = e
	}
}
