//go:build unix

package ledger

import (
	"fmt"
	"testing"

	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/unit"
)

// wild draws an entry that may be anything that a ledger takes: of no length
// or of hours, in spans of a quarter of an hour or of an hour, without prices,
// in doubt, one part of several, anywhere.
func wild(t *rapid.T) *Entry {
	n := func(most int, what string) int { return rapid.IntRange(0, most).Draw(t, what) }
	one := func(of ...string) string { return rapid.SampledFrom(of).Draw(t, "name") }
	start, length := 15*n(300, "start")+n(1, "odd"), n(1, "long")*n(600, "minutes")
	e := entry(one("r1", "r2", "r3", "r4"), repository(one("harbour/tide", "harbour/ebb", "")), charged(one("main", "pull/7")),
		job(one("retrain-tide", "probe"), "training"), part(one("a", "b", "c"), 1+n(2, "of")))
	e.Attempt, e.Site, e.Parts[0].Site = 1+n(1, "attempt"), "quay-north", "quay-north"
	if n(3, "site") == 0 {
		e.Site, e.Parts[0].Site = "quay-south", "quay-south"
	}
	e.Start, e.End = minutes(start), minutes(start+length)
	e.Digest, e.Closed, e.Hours, e.Embodied = fmt.Sprint(n(99, "digest")), n(3, "closed") > 0, nil, nil
	if n(3, "embodied") > 0 {
		e.Embodied = ptr(unit.Mass(n(900, "g")) / 7)
	}
	wildHours(t, e, start, start+length)
	return wildDoubts(e, n(5, "doubt"))
}

func minutes(n int) unit.Instant { return midnight.Add(unit.Duration(n) * unit.Minute) }

// wildHours draws the entry's spans, some of them without energy.
func wildHours(t *rapid.T, e *Entry, from, to int) {
	step := rapid.SampledFrom([]int{15, 60}).Draw(t, "step")
	for at := from; at < to || at == from; at = at/step*step + step {
		kwh := rapid.IntRange(0, 50).Draw(t, "kwh")
		h := footprint.Hour{From: minutes(at), KWh: unit.Energy(kwh) / 11}
		if rapid.IntRange(0, 5).Draw(t, "priced") > 0 {
			h.G = ptr(unit.Mass(kwh) * 37 / 3)
		}
		if kwh > 0 {
			e.Hours = append(e.Hours, h)
		}
	}
}

func wildDoubts(e *Entry, doubt int) *Entry {
	e.ProvenKWh, e.ProvenG = unit.Energy(1)/3, unit.Mass(500)/7
	switch doubt {
	case 0:
		e.Total = nil
	case 1:
		e.Reasons = []footprint.Doubt{{Reason: "no intensity", Price: true}}
	case 2:
		e.Reasons = []footprint.Doubt{{Reason: "meter missing", Refutes: true}}
	}
	return e
}

// wildWindow draws a window with edges on hours and within them.
func wildWindow(t *rapid.T) Window {
	from := rapid.IntRange(-100, 5400).Draw(t, "from")
	length := rapid.SampledFrom([]int{0, 1, 30, 59, 60, 61, 90, 120, 1440, 44640}).Draw(t, "length")
	if rapid.Bool().Draw(t, "whole") {
		from = from / 60 * 60
	}
	return Window{Repository: rapid.SampledFrom([]string{"harbour/tide", "harbour/ebb", ""}).Draw(t, "repository"),
		Account: rapid.SampledFrom([]string{"main", "pull/7", "", "none"}).Draw(t, "account"), From: minutes(from), To: minutes(from + length)}
}

// TestPostgresSums: whatever is booked, corrected and superseded, the database
// adds up what Books adds up of all its entries.
func TestPostgresSums(t *testing.T) {
	s := opened(t, freshDatabase(t))
	rapid.Check(t, func(t *rapid.T) {
		empty(t, s)
		for range rapid.IntRange(1, 4).Draw(t, "bookings") {
			book(t, s, rapid.SliceOfN(rapid.Custom(wild), 1, 8).Draw(t, "entries")...)
			corrects(t, s)
		}
		all := read(t, s, Query{})
		for range 6 {
			w := wildWindow(t)
			want, got := all.Spent(w), spentBy(t, s, w)
			require.Len(t, got.Lines, len(want.Lines), "%+v", w)
			for n := range want.Lines {
				equalSpent(t, want.Lines[n], got.Lines[n])
			}
		}
		lastAgree(t, s, all)
		sound(t, s)
	})
}

// corrects corrects one of the entries, which may move it anywhere.
func corrects(t *rapid.T, s Store) {
	all := read(t, s, Query{}).Entries
	old, e := rapid.SampledFrom(all).Draw(t, "old"), wild(t)
	e.Repository, e.Run.Run, e.Attempt, e.Parts[0].Part = old.Repository, old.Run.Run, old.Attempt, old.part()
	e.Corrects = old.ID()
	require.Equal(t, []Answer{Booked}, book(t, s, e))
}

// lastAgree compares the newest runs with those of all entries.
func lastAgree(t *rapid.T, s Store, all *Books) {
	q := Query{Last: rapid.IntRange(1, 3).Draw(t, "last"), Since: minutes(rapid.IntRange(-100, 3000).Draw(t, "since"))}
	if rapid.Bool().Draw(t, "until") {
		q.Until = minutes(rapid.IntRange(0, 5400).Draw(t, "until"))
	}
	if rapid.Bool().Draw(t, "accounts") {
		q.Accounts = []string{"main"}
	}
	var asked []*Entry
	for _, e := range all.Entries {
		if q.keeps(e) {
			asked = append(asked, e)
		}
	}
	want := &Books{Entries: lastRuns(asked, q.Last)}
	require.Equal(t, names(want), names(read(t, s, q)), "%+v", q)
}

// empty takes everything out of a ledger.
func empty(t test, s *postgres) {
	t.Helper()
	for _, table := range []string{"lines", "heads", "marks", "groups", "entries", "attempts", "going", "hours", "days"} {
		_, err := s.pool.Exec(ctx, "DELETE FROM ledger_"+table)
		require.NoError(t, err)
	}
}
