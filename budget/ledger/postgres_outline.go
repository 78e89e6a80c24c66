package ledger

import (
	"maps"

	"budgetcheck/budget/unit"
)

// kept is an entry and the number of its line.
type kept struct {
	*Entry
	n int64
}

// outline is what the tables say of entries in force, besides their sums: all
// the parts of some attempts. Rows can be compared, so that what a booking
// changes is the difference of two outlines.
type outline struct {
	entries  map[entryRow]bool
	attempts map[attemptRow]bool
	going    map[goingRow]bool
	begun    map[hourRow]int64
}

type entryRow struct {
	id, attempt, group     id
	repository             string
	n                      int64
	starts, ends           unit.Instant
	inDoubt                int64
	run                    string
	provenKWh              unit.Energy
	provenG                unit.Mass
	inputs, commit, digest string
}

type attemptRow struct {
	group, attempt id
	starts         span // of its first and last part of the course
}

type goingRow struct {
	group   id
	hour    int64
	attempt id
}

type hourRow struct {
	group id
	hour  int64
}

// course is an attempt's parts of one account, job and stage.
type course struct {
	attempt             attempt
	account, job, stage string
}

func (e *Entry) course() course { return course{e.attempt(), e.Account, e.Job, e.Stage} }

// stretch is an attempt's parts in one group.
type stretch struct{ group, attempt id }

type span struct{ from, to unit.Instant }

// outlined gives the rows of entries.
func outlined(entries map[Key]kept) *outline {
	o := &outline{map[entryRow]bool{}, map[attemptRow]bool{}, map[goingRow]bool{}, map[hourRow]int64{}}
	parts, starts, spans := map[attempt]int{}, map[course]span{}, map[stretch]span{}
	for _, e := range entries {
		parts[e.attempt()]++
		widen(starts, e.course(), span{e.Start, e.Start})
	}
	for k, e := range entries {
		r := e.row(k, parts[e.attempt()] < e.Of)
		o.entries[r] = true
		o.attempts[attemptRow{r.group, r.attempt, starts[e.course()]}] = true
		widen(spans, stretch{r.group, r.attempt}, span{e.Start, max(e.Start, e.End)})
	}
	for at, s := range spans {
		o.goes(at, s)
	}
	return o
}

// widen makes the span of k hold s too.
func widen[K comparable](spans map[K]span, k K, s span) {
	if had, ok := spans[k]; ok {
		s = span{min(s.from, had.from), max(s.to, had.to)}
	}
	spans[k] = s
}

// goes enters the hours from an attempt's first start to its last end.
func (o *outline) goes(at stretch, s span) {
	o.begun[hourRow{at.group, s.from.Hour()}]++
	for h := s.from.Hour(); h <= s.to.Hour(); h++ {
		o.going[goingRow{at.group, h, at.attempt}] = true
	}
}

// row is the entry's; incomplete tells that parts of its run are not booked.
func (e kept) row(k Key, incomplete bool) entryRow {
	kwh, g := e.proven()
	return entryRow{
		id: k.id(), attempt: e.attempt().id(), group: e.groupID(), repository: cell(e.Repository), n: e.n,
		starts: e.Start, ends: e.End, inDoubt: e.doubts().or(doubts{incomplete, incomplete}).bits(), run: encode(e.Run.Run), provenKWh: kwh, provenG: g,
		inputs: cell(e.Inputs), commit: cell(e.Commit), digest: cell(e.Digest),
	}
}

// without gives the rows of a that b has not.
func without[R comparable](a, b map[R]bool) (rows []R) {
	for r := range a {
		if !b[r] {
			rows = append(rows, r)
		}
	}
	return rows
}

// fewer gives a less b, by hour, where that is not zero.
func fewer(a, b map[hourRow]int64) map[hourRow]int64 {
	d := maps.Clone(a)
	for h, n := range b {
		if d[h] -= n; d[h] == 0 {
			delete(d, h)
		}
	}
	return d
}
