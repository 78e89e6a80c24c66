package ledger

import (
	"cmp"
	"fmt"
	"slices"
	"testing"

	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/unit"
)

// deed is an entry to be booked, told in small numbers so that keys and
// contents meet often.
type deed struct {
	run, part, more, kwh, account, job int
	closed, correct, stale             bool
	unpriced, thin                     bool
}

// history is a number of bookings, one after the other.
type history [][]deed

var histories = rapid.Custom(func(t *rapid.T) history {
	one := rapid.Custom(func(t *rapid.T) deed {
		n := func(most int) int { return rapid.IntRange(0, most).Draw(t, "n") }
		b := func() bool { return rapid.IntRange(0, 3).Draw(t, "b") == 0 }
		return deed{n(4), n(1), n(2), n(1), n(1), n(1), !b(), b(), b(), b(), b()}
	})
	return rapid.SliceOfN(rapid.SliceOfN(one, 1, 6), 1, 6).Draw(t, "history")
})

// plain is a ledger as one would keep it in one's head: by key, what is in
// force.
type plain struct {
	repository string
	force      map[Key]*Entry
	corrected  map[Key]*Entry // by which correction, as it was handed in
	fresh      map[Key]bool   // changed by the booking at hand, so that nobody can know its ID
}

// make makes the entry that a deed tells of.
func (p *plain) make(d deed, ids map[Key]string) *Entry {
	start := 100*float64(d.run) + 20 // so that some lie in other months
	e := entry(fmt.Sprint("r", d.run), repository(p.repository), part(fmt.Sprint(d.part), 2), lasting(start, float64(1+d.more)),
		energy(float64(1+d.kwh)), charged([]string{"main", "pull/7"}[d.account]), job([]string{"retrain-tide", "probe"}[d.job], "training"))
	if d.unpriced {
		unpriced(e)
	}
	if d.thin {
		e.Thin = "coverage is 0.5"
	}
	if !d.closed {
		unclosed(e)
	}
	if d.correct {
		e.Corrects = cmp.Or(ids[e.Key()], "0badc0de")
		if d.stale {
			e.Corrects = "0badc0de"
		}
	}
	return e
}

// book tells what must become of an entry, in the contract's words.
func (p *plain) book(e *Entry) Answer {
	k := e.Key()
	old := p.force[k]
	content := func(e *Entry) string {
		return fmt.Sprint(e.Digest, e.Closed, e.Outcome, e.Start, e.End, e.Job, e.Stage)
	}
	last := p.corrected[k]
	switch {
	case e.Corrects != "" && last != nil && fmt.Sprintf("%+v", flat(last)) == fmt.Sprintf("%+v", flat(e)):
		return Already
	case e.Corrects != "" && (old == nil || e.Corrects == "0badc0de" || p.fresh[k]):
		return Unfounded
	case e.Corrects != "":
		p.force[k], p.corrected[k], p.fresh[k] = e, e, true
		return Booked
	case old == nil:
		p.force[k], p.fresh[k] = e, true
		return Booked
	case content(old) == content(e):
		return Already
	case !e.Closed && old.Corrects == "" && (e.End < old.End || e.End == old.End && old.Closed):
		return Already
	case !old.Closed && (e.End > old.End || e.End == old.End && e.Closed):
		p.force[k], p.fresh[k] = e, true
		delete(p.corrected, k)
		return Longer
	}
	return Refused
}

// flat is what an entry says, without its pointers.
func flat(e *Entry) []any {
	return []any{e.Key(), e.Account, e.Corrects, e.Digest, e.Closed, e.Start, e.End, e.Job, e.Total != nil, e.Thin}
}

// entries are those in force that a query asks for, found by looking at each.
func (p *plain) entries(q Query) (list []*Entry) {
	for _, e := range p.force {
		if e.End > q.Since && (q.Until == 0 || e.Start < q.Until) && (len(q.Accounts) == 0 || slices.Contains(q.Accounts, e.Account)) {
			list = append(list, e)
		}
	}
	slices.SortFunc(list, func(a, b *Entry) int {
		return cmp.Or(cmp.Compare(a.Start, b.Start), cmp.Compare(a.Run.Run, b.Run.Run), cmp.Compare(a.part(), b.part()))
	})
	return list
}

// live books a history into a store and into a plain ledger of the same
// repository, which must agree at every step.
func live(t test, s Store, repository string, h history) {
	p := &plain{repository: repository, force: map[Key]*Entry{}, corrected: map[Key]*Entry{}}
	for _, deeds := range h {
		p.fresh = map[Key]bool{}
		ids := map[Key]string{}
		for _, e := range read(t, s, Query{Repository: repository}).Entries {
			ids[e.Key()] = e.ID()
		}
		var list []*Entry
		var want []Answer
		for _, d := range deeds {
			e := p.make(d, ids)
			list, want = append(list, e), append(want, p.book(e))
		}
		require.Equal(t, want, book(t, s, list...))
		agree(t, p, s, Query{Repository: repository})
	}
	for _, account := range []string{"main", "pull/7"} {
		agree(t, p, s, Query{Repository: repository, Accounts: []string{account}})
	}
	for run := range 5 {
		from := hours(100*float64(run) + 21)
		agree(t, p, s, Query{Repository: repository, Since: from, Until: from.Add(200 * unit.Hour)})
	}
	spend(t, p, s)
}

// agree compares what a query gives.
func agree(t test, p *plain, s Store, q Query) {
	want, got := p.entries(q), read(t, s, q)
	require.Len(t, got.Entries, len(want), "%+v", q)
	for n := range want {
		alike(t, want[n], got.Entries[n])
	}
}

// spend compares sums over windows, some of which cut hours and runs, with
// sums by brute force over the plain ledger; those of a store that adds up by
// itself too.
func spend(t test, p *plain, s Store) {
	all := read(t, s, Query{Repository: p.repository})
	for n := range 6 {
		w := Window{Repository: p.repository, Account: []string{"main", ""}[n%2], From: hours(50 * float64(n)), To: hours(50*float64(n) + 171.5 + float64(n))}
		want := p.spent(w)
		got := []Spending{all.Spent(w), read(t, s, Query{Repository: p.repository, Since: w.From.Add(-unit.Day), Until: w.To}).Spent(w)}
		if adds, ok := s.(Summing); ok {
			sum, err := adds.Spent(ctx, w)
			require.NoError(t, err)
			got = append(got, sum)
		}
		for _, sum := range got {
			require.Len(t, sum.Lines, len(want))
			for i := range want {
				equalSpent(t, want[i], sum.Lines[i])
			}
		}
	}
}

func equalSpent(t test, want, got Spent) {
	const close = 1e-9
	require.Equal(t, want.Group, got.Group)
	require.Equal(t, want.Runs, got.Runs)
	require.Equal(t, want.InDoubt, got.InDoubt)
	require.Equal(t, want.InDoubtKWh, got.InDoubtKWh)
	require.InDelta(t, float64(want.Facility), float64(got.Facility), close*float64(want.Facility))
	require.InDelta(t, float64(want.Operational), float64(got.Operational), close*float64(want.Operational))
	require.InDelta(t, float64(want.Embodied), float64(got.Embodied), close*float64(want.Embodied))
	require.InDelta(t, float64(want.ProvenKWh), float64(got.ProvenKWh), close*float64(want.ProvenKWh))
	require.InDelta(t, float64(want.ProvenG), float64(got.ProvenG), close*float64(want.ProvenG))
	require.InDelta(t, float64(want.SureKWh), float64(got.SureKWh), close*float64(want.SureKWh))
	require.InDelta(t, float64(want.SureG), float64(got.SureG), close*float64(want.SureG))
}

// spent adds up a window minute by minute: the entries of this test change
// nothing within a minute.
func (p *plain) spent(w Window) (lines []Spent) {
	parts := map[string]int{}
	for _, e := range p.force {
		parts[e.Run.Run]++
	}
	type doubt struct{ any, energy bool }
	sums, doubted := map[Group]*Spent{}, map[Group]map[string]doubt{}
	for _, e := range p.entries(Query{Since: w.From, Until: w.To}) {
		g := e.group()
		if w.Account != "" && e.Account != w.Account {
			continue
		}
		if sums[g] == nil {
			sums[g], doubted[g] = &Spent{Group: g}, map[string]doubt{}
		}
		addPlainly(sums[g], e, w)
		d, unknown := doubted[g][e.Run.Run], e.Thin != "" || parts[e.Run.Run] < 2
		doubted[g][e.Run.Run] = doubt{d.any || unknown || e.Total == nil, d.energy || unknown}
	}
	for g, s := range sums {
		for run, doubt := range doubted[g] {
			s.Runs++
			if doubt.any {
				s.InDoubt = append(s.InDoubt, run)
			}
			if doubt.energy {
				s.InDoubtKWh = append(s.InDoubtKWh, run)
			}
		}
		slices.Sort(s.InDoubt)
		slices.Sort(s.InDoubtKWh)
		lines = append(lines, *s)
	}
	slices.SortFunc(lines, func(a, b Spent) int { return cmp.Compare(a.Job, b.Job) })
	return lines
}

func addPlainly(s *Spent, e *Entry, w Window) {
	var inside, all float64 // minutes
	for at := e.Start; at < e.End; at = at.Add(unit.Minute) {
		all++
		if at >= w.From && at < w.To {
			inside++
		}
	}
	facility, embodied := unit.Energy(inside/60), *e.Embodied*unit.Mass(inside/all)
	operational := 400 * unit.Mass(facility)
	if e.Total == nil {
		operational = 0
	}
	s.Facility, s.Operational, s.Embodied = s.Facility+facility, s.Operational+operational, s.Embodied+embodied
	if e.Thin == "" {
		s.SureKWh += facility // a price that is missing leaves energy as it is
	} else if inside == all {
		s.ProvenKWh += e.ProvenKWh
	}
	if e.Thin == "" && e.Total != nil {
		s.SureG += operational + embodied
	} else if inside == all {
		s.ProvenG += e.ProvenG + embodied
	}
}

// suiteHistories lives through some histories, each in a repository of its
// own. The file store meets many more.
func suiteHistories(t *testing.T, open func(*testing.T) Store) {
	s := open(t)
	few := 4
	if testing.Short() {
		few = 2
	}
	for seed := range few {
		live(t, s, fmt.Sprint("harbour/", seed), histories.Example(seed))
	}
	sound(t, s)
}
