package ledger

import (
	"fmt"
	"slices"
	"sync"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// suite is what every store has to pass. open opens the same ledger each time
// it is called for one t, and an empty one the first time.
func suite(t *testing.T, open func(t *testing.T) Store) {
	for name, check := range map[string]func(*testing.T, func(*testing.T) Store){
		"empty": suiteEmpty, "booking": suiteBooking, "again": suiteAgain, "longer": suiteLonger, "refused": suiteRefused,
		"correction": suiteCorrection, "one step": suiteOneStep, "marks": suiteMarks, "query": suiteQuery, "last": suiteLast,
		"order": suiteOrder, "all figures": suiteFigures, "odd text": suiteOddText, "at once": suiteAtOnce, "caller's": suiteCallers,
		"not a number": suiteNotANumber, "histories": suiteHistories,
	} {
		t.Run(name, func(t *testing.T) { check(t, open) })
	}
}

func suiteEmpty(t *testing.T, open func(*testing.T) Store) {
	s := open(t)
	b := read(t, s, Query{})
	assert.Empty(t, b.Entries)
	assert.Empty(t, b.Marks)
	sound(t, s)
	answers, err := s.Book(ctx, nil, nil)
	require.NoError(t, err)
	assert.Empty(t, answers)
	assert.Empty(t, read(t, s, Query{}).Entries)
}

// suiteBooking: what was booked is there, for another reader too.
func suiteBooking(t *testing.T, open func(*testing.T) Store) {
	s := open(t)
	want := []*Entry{entry("r1"), entry("r2", lasting(1, 30)), entry("r3", lasting(2, 0.25))}
	assert.Equal(t, []Answer{Booked, Booked, Booked}, book(t, s, want...))
	require.NoError(t, s.Close())
	other := open(t)
	b := read(t, other, Query{})
	require.Equal(t, []string{"r1", "r2", "r3"}, names(b))
	for n, e := range b.Entries {
		alike(t, want[n], e)
		assert.GreaterOrEqual(t, e.BookedAt, e.End, "an entry is booked when its run has ended")
	}
	sound(t, other)
}

// alike checks two entries, but for the time at which they were booked.
func alike(t require.TestingT, want, got *Entry) {
	a, b := *want, *got
	a.BookedAt, b.BookedAt = 0, 0
	require.Equal(t, a, b)
}

// suiteAgain: the same again changes nothing, however its facts and prices
// have changed since, and also without the last line of its record.
func suiteAgain(t *testing.T, open func(*testing.T) Store) {
	s := open(t)
	book(t, s, entry("r1"), entry("part", part("a", 2)), entry("part", part("b", 2)))
	before := read(t, s, Query{})
	priced := func(e *Entry) { e.Facts, e.Total, e.BookedAt = "ff01", ptr(unit.Mass(7)), hours(99) }
	later := func(e *Entry) { e.BookedAt = hours(100) }
	assert.Equal(t, []Answer{Already, Already, Already, Already},
		book(t, s, entry("r1"), entry("r1", priced), entry("part", part("b", 2), later), entry("r1", unclosed)))
	assert.Equal(t, before, read(t, s, Query{}))
	labels := func(e *Entry) { e.Labels, e.Work = map[string]string{}, &record.Work{Unit: "step", OfPart: true} }
	ofPart := func(e *Entry) { e.WorkOfPart = true }
	assert.Equal(t, []Answer{Booked, Already}, book(t, s, entry("r2", labels, ofPart), entry("r2", labels, ofPart)), "twice at once")
	assert.Equal(t, []Answer{Already}, book(t, s, entry("r2", labels, ofPart)), "what JSON leaves out makes no other content")
	sound(t, s)
}

// suiteLonger: more of an unclosed record stands in for less of it.
func suiteLonger(t *testing.T, open func(*testing.T) Store) {
	s := open(t)
	killed := entry("r1", lasting(0, 1), unclosed)
	assert.Equal(t, []Answer{Booked, Longer}, book(t, s, killed, entry("r1", lasting(0, 2), unclosed)))
	assert.Equal(t, []Answer{Already}, book(t, s, killed), "less of a record says nothing new")
	assert.Equal(t, []Answer{Longer}, book(t, s, entry("r1", lasting(0, 2))), "closed at last")
	assert.Equal(t, []Answer{Already}, book(t, s, killed))
	assert.Equal(t, []Answer{Refused}, book(t, s, entry("r1", lasting(0, 3))), "a closed record does not grow")
	b := read(t, s, Query{})
	require.Equal(t, []string{"r1"}, names(b))
	assert.True(t, b.Entries[0].Closed)
	assert.Equal(t, hours(2), b.Entries[0].End)
	sound(t, s)
}

// suiteRefused: a key is taken by what was booked first; others are not held
// up by it.
func suiteRefused(t *testing.T, open func(*testing.T) Store) {
	s := open(t)
	book(t, s, entry("r1"))
	before := read(t, s, Query{}).Entries[0]
	edits := map[string]func(*Entry){
		"energy": energy(3), "end": lasting(0, 2), "start": lasting(0.5, 1), "outcome": func(e *Entry) { e.Outcome = record.Stopped },
		"job": job("other", "training"), "stage": job("retrain-tide", "evaluation"), "labels": func(e *Entry) { e.Labels = map[string]string{"a": "b"} },
		"work": func(e *Entry) { e.Work = &record.Work{Unit: "step", Done: 1} }, "no work": func(e *Entry) { e.Work = nil },
		"work of the part": func(e *Entry) { e.WorkOfPart = true }, "site": func(e *Entry) { e.Parts[0].Site = "quay-south" },
		"machine": func(e *Entry) { e.Parts[0].Machine = "octo" }, "host": func(e *Entry) { e.Parts[0].Host = "h" },
		"reserved": func(e *Entry) { e.Parts[0].Reserved = 2 }, "parts": func(e *Entry) { e.Of = 2 },
	}
	var list []*Entry
	for _, edit := range edits {
		list = append(list, entry("r1", edit))
	}
	for n, a := range book(t, s, list...) {
		assert.Equal(t, Refused, a, "%+v", list[n])
	}
	others := []*Entry{entry("r1", func(e *Entry) { e.Attempt = 2 }), entry("r1", part("b", 2)), entry("r1", repository("harbour/ebb"))}
	assert.Equal(t, []Answer{Refused, Booked, Booked, Booked}, book(t, s, append([]*Entry{entry("r1", energy(3))}, others...)...), "another key is another entry")
	assert.Contains(t, read(t, s, Query{}).Entries, before)
	sound(t, s)
}

// suiteCorrection: a correction takes the place of the entry that it names,
// once; the entry itself stays in the books.
func suiteCorrection(t *testing.T, open func(*testing.T) Store) {
	s := open(t)
	book(t, s, entry("r1"), entry("r2"))
	first := read(t, s, Query{}).Entries[0]
	corrected := entry("r1", energy(3), correcting(first))
	assert.Equal(t, []Answer{Booked}, book(t, s, corrected))
	assert.Equal(t, []Answer{Already}, book(t, s, corrected))
	assert.Equal(t, []Answer{Unfounded, Unfounded, Unfounded}, book(t, s, entry("r1", energy(4), correcting(first)),
		entry("r3", correcting(first)), entry("r2", correcting(first))), "what it corrects is in force no more, or of another key")
	b := read(t, s, Query{})
	require.Equal(t, []string{"r1", "r2"}, names(b))
	alike(t, corrected, b.Entries[0])
	// A correction may move the run to another account, time and length.
	second := entry("r1", lasting(-2, 1), charged("pull/7"), correcting(b.Entries[0]))
	assert.Equal(t, []Answer{Booked}, book(t, s, second))
	b = read(t, s, Query{})
	require.Equal(t, []string{"r1", "r2"}, names(b))
	alike(t, second, b.Entries[0])
	assert.Equal(t, []string{"r2"}, names(read(t, s, Query{Accounts: []string{"main"}})), "no entry that was corrected comes back under its old account")
	assert.Equal(t, []string{"r2"}, names(read(t, s, Query{Since: hours(0)})))
	assert.Equal(t, []Answer{Refused}, book(t, s, entry("r1")), "the record as it was is other content now")
	sound(t, s)
}

// suiteOneStep: what is refused holds nothing else up, and entries of one
// booking see each other.
func suiteOneStep(t *testing.T, open func(*testing.T) Store) {
	s := open(t)
	list := []*Entry{entry("r1", unclosed), entry("r1", energy(9)), entry("r2"), entry("r2", energy(2)), entry("r1", lasting(0, 5), energy(1)), entry("r2")}
	answers, err := s.Book(ctx, list, []*Mark{mark("v1", 4)})
	require.NoError(t, err)
	assert.Equal(t, []Answer{Booked, Longer, Booked, Refused, Refused, Already}, answers)
	b := read(t, s, Query{})
	assert.Equal(t, []string{"r1", "r2"}, names(b))
	assert.Equal(t, []string{"v1"}, tags(b))
	sound(t, s)
}

func suiteMarks(t *testing.T, open func(*testing.T) Store) {
	s := open(t)
	marks := []*Mark{mark("v2", 30), mark("v1", 5), mark("v2", 30)}
	other := mark("v1", 5)
	other.Repository = "harbour/ebb"
	for range 2 {
		_, err := s.Book(ctx, nil, append(marks, other))
		require.NoError(t, err)
	}
	book(t, s, entry("r1", lasting(40, 1)))
	_, err := s.Book(ctx, nil, []*Mark{mark("v0", 1)})
	require.NoError(t, err)
	for n, c := range []struct {
		q    Query
		tags []string
	}{
		{Query{}, []string{"v0", "v1", "v1", "v2"}},
		{Query{Repository: "harbour/tide"}, []string{"v0", "v1", "v2"}},
		{Query{Repository: "harbour/tide", Since: hours(5)}, []string{"v1", "v2"}},
		{Query{Repository: "harbour/tide", Since: hours(5) + 1}, []string{"v2"}},
		{Query{Repository: "harbour/tide", Until: hours(30)}, []string{"v0", "v1"}},
		{Query{Repository: "harbour/tide", Until: hours(30) + 1, Since: hours(30)}, []string{"v2"}},
	} {
		assert.Equal(t, c.tags, tags(read(t, s, c.q)), "%d", n)
	}
	assert.Equal(t, mark("v0", 1), read(t, s, Query{}).Marks[0])
	only := read(t, s, Query{OnlyMarks: true})
	assert.Empty(t, only.Entries)
	assert.Len(t, only.Marks, 4)
	sound(t, s)
}

// suiteQuery tries each field of a query by itself, and some together.
func suiteQuery(t *testing.T, open func(*testing.T) Store) {
	s := open(t)
	book(t, s, entry("a", lasting(0, 1), inputs("i1"), commit("k1")), entry("b", lasting(1, 50), charged("pull/7"), inputs("i2")),
		entry("c", lasting(40, 2), repository("harbour/ebb"), commit("k2")), entry("d", lasting(800, 1), job("probe", "evaluation")),
		entry("e", lasting(801, 1), repository("")))
	digest := entry("d", lasting(800, 1)).Digest
	for _, c := range []struct {
		q    Query
		runs []string
	}{
		{Query{}, []string{"a", "b", "c", "d", "e"}},
		{Query{Repository: "harbour/tide"}, []string{"a", "b", "d", "e"}}, // e is of any
		{Query{Accounts: []string{"pull/7", "pull/8"}}, []string{"b"}},
		{Query{Accounts: []string{"main", "pull/7"}}, []string{"a", "b", "c", "d", "e"}},
		{Query{Since: hours(1)}, []string{"b", "c", "d", "e"}}, // a ended just then
		{Query{Since: hours(1) - 1}, []string{"a", "b", "c", "d", "e"}},
		{Query{Since: hours(51)}, []string{"d", "e"}},
		{Query{Until: hours(1)}, []string{"a"}}, // b starts just then
		{Query{Until: hours(1) + 1}, []string{"a", "b"}},
		{Query{Since: hours(41), Until: hours(50)}, []string{"b", "c"}},
		{Query{Inputs: []string{"i1", "i9"}}, []string{"a"}},
		{Query{Commits: []string{"k2"}}, []string{"c"}},
		{Query{Digests: []string{digest}}, []string{"d"}},
		{Query{Inputs: []string{"i1"}, Commits: []string{"k2"}, Digests: []string{digest}}, []string{"a", "c", "d"}}, // any of them
		{Query{Inputs: []string{"i1"}, Commits: []string{"k2"}, Since: hours(10)}, []string{"c"}},
		{Query{Accounts: []string{"nobody"}}, []string{}},
		{Query{OnlyMarks: true}, []string{}},
	} {
		b := read(t, s, c.q)
		assert.Equal(t, c.runs, names(b), "%+v", c.q)
		assert.Equal(t, c.q.Since, b.Since)
	}
}

// suiteLast: at most so many runs of each account, job and stage; a run of
// several parts counts once.
func suiteLast(t *testing.T, open func(*testing.T) Store) {
	s := open(t)
	var list []*Entry
	for n := range 4 {
		start := lasting(float64(10*n), 1)
		list = append(list, entry(fmt.Sprint("a", n), start, part("x", 2)), entry(fmt.Sprint("a", n), start, part("y", 2)),
			entry(fmt.Sprint("b", n), start, job("probe", "training")), entry(fmt.Sprint("c", n), start, job("probe", "evaluation")),
			entry(fmt.Sprint("d", n), start, charged("pull/7")))
	}
	book(t, s, list...)
	assert.Equal(t, []string{"a2x", "a2y", "b2", "c2", "d2", "a3x", "a3y", "b3", "c3", "d3"}, names(read(t, s, Query{Last: 2})))
	assert.Equal(t, []string{"a1x", "a1y", "b1", "c1"}, names(read(t, s, Query{Last: 1, Accounts: []string{"main"}, Until: hours(20)})), "the last of those that are asked for")
	assert.Len(t, read(t, s, Query{Last: 99}).Entries, len(list))
}

// suiteOrder: entries come in order of start, whichever was booked first, also
// when a clock goes wrong.
func suiteOrder(t *testing.T, open func(*testing.T) Store) {
	s := open(t)
	back := func(e *Entry) { e.BookedAt = hours(-1000) }
	for _, e := range []*Entry{entry("d", lasting(9, 1)), entry("a", lasting(1, 30)), entry("c", lasting(3, 1), back), entry("b", lasting(3, 1), back), entry("e", lasting(750, 1), back)} {
		book(t, s, e)
	}
	want := []string{"a", "b", "c", "d", "e"}
	assert.Equal(t, want, names(read(t, s, Query{})))
	for _, since := range []int{0, 3, 4, 9, 10, 30, 31, 39} { // what ended after it is found, whatever the clocks said
		var expect []string
		for n, end := range []int{31, 4, 4, 10, 751} {
			if end > since {
				expect = append(expect, want[n])
			}
		}
		assert.Equal(t, expect, names(read(t, s, Query{Since: hours(float64(since))})), "%d", since)
	}
	sound(t, s)
}

// suiteFigures: every field of an entry comes back as it was.
func suiteFigures(t *testing.T, open func(*testing.T) Store) {
	s := open(t)
	full := entry("r1", func(e *Entry) {
		e.Labels = map[string]string{"dataset": "tide-2030", "k": "run"}
		e.Coverage, e.Expanded, e.Market = ptr(unit.Share(0.1+0.2)), ptr(unit.Mass(1e-300)), ptr(unit.Mass(1e300))
		e.Intensity, e.Rate, e.Pilot = ptr(unit.Intensity(1.0/3)), ptr(5e-324), true
		e.Priced = &footprint.Priced{Series: 0.5, Expected: 0.25, Annual: 0.25}
		e.Notes, e.Pull, e.Why, e.Host = []string{"provisional"}, 7, "late", "h1"
		e.FilledKWh, e.UnmeteredKWh, e.ExpectedUG, e.GapUKWh, e.GapUG = 0.1, 0.2, 0.3, 0.4, 0.5
		e.Reasons = []footprint.Doubt{{Reason: "meter missing", Observed: 1, Limit: 2, Unit: "meters", Refutes: true, Missing: true, Price: true}}
		e.Parts[0].Meters, e.Parts[0].Coverage, e.Parts[0].Reserved = []string{"gpu-0", "gpu-1"}, ptr(unit.Share(1)), 2
		e.Start, e.End = e.Start+1, e.End+999_999_999 // nanoseconds
		e.Hours[0].By = 1
	})
	book(t, s, full, entry("bare", func(e *Entry) {
		*e = Entry{Kind: KindRun, BookedAt: hours(0), Booked: footprint.Booked{Run: footprint.Run{Run: "bare", Start: hours(0), End: hours(0), Parts: []footprint.RunPart{{}}}}}
	}))
	b := read(t, s, Query{})
	require.Equal(t, []string{"bare", "r1"}, names(b))
	alike(t, full, b.Entries[1])
	assert.Nil(t, b.Entries[0].Total)
	assert.Equal(t, b.Entries[1].ID(), read(t, s, Query{Since: hours(0)}).Entries[0].ID(), "an ID is that of the content")
}

// suiteOddText: text from records is foreign; it comes back as it was.
func suiteOddText(t *testing.T, open func(*testing.T) Store) {
	s := open(t)
	odd := []string{"a\nb", "\"quoted\" \\ back", "'; DROP TABLE lines; --", "Ünïcode 潮 🌊", `","account":"evil`, "\u2028<&>", "tab\there", "{}", "%s"}
	var list []*Entry
	for n, text := range odd {
		list = append(list, entry(text, lasting(float64(n), 1), charged(text), job(text, text), part(text, 1), inputs(text), commit(text)))
	}
	book(t, s, list...)
	assert.Equal(t, slices.Repeat([]Answer{Already}, len(odd)), book(t, s, list...))
	require.Len(t, read(t, s, Query{}).Entries, len(odd))
	for n, text := range odd {
		b := read(t, s, Query{Accounts: []string{text}})
		require.Len(t, b.Entries, 1, "%q", text)
		alike(t, list[n], b.Entries[0])
	}
	for n := range 3 { // commits are told apart from inputs, and each from the others
		for _, q := range []Query{{Inputs: odd[3*n : 3*n+3]}, {Commits: odd[3*n : 3*n+3]}} {
			require.Len(t, read(t, s, q).Entries, 3, "%+v", q)
		}
	}
	sound(t, s)
}

// suiteAtOnce: bookings at once lose nothing and double nothing, also when
// they all try the same.
func suiteAtOnce(t *testing.T, open func(*testing.T) Store) {
	const workers, each = 4, 3
	open(t)
	stores := make([]Store, workers)
	for n := range stores {
		stores[n] = open(t)
	}
	var wait sync.WaitGroup
	answers := make([][]Answer, workers)
	for n, s := range stores {
		wait.Go(func() {
			for i := range each {
				list := []*Entry{entry("shared", lasting(0, 1)), entry(fmt.Sprint(n, "-", i), lasting(float64(i), 1))}
				got, err := s.Book(ctx, list, []*Mark{mark("v1", 3)})
				if assert.NoError(t, err) {
					answers[n] = append(answers[n], got...)
				}
			}
		})
	}
	wait.Wait()
	all := slices.Concat(answers...)
	require.Len(t, all, 2*workers*each)
	already := 0
	for _, a := range all {
		if a == Already {
			already++
		}
	}
	assert.Equal(t, workers*each-1, already, "one of them booked the shared one")
	b := read(t, stores[0], Query{})
	assert.Len(t, b.Entries, 1+workers*each)
	assert.Equal(t, []string{"v1"}, tags(b))
	sound(t, stores[0])
}

// suiteCallers: what is handed in stays the caller's.
func suiteCallers(t *testing.T, open func(*testing.T) Store) {
	s := open(t)
	e, again, m := entry("r1", func(e *Entry) { e.BookedAt = hours(-5) }), entry("r1", func(e *Entry) { e.BookedAt = hours(-5) }), mark("v1", 3)
	_, err := s.Book(ctx, []*Entry{e}, []*Mark{m})
	require.NoError(t, err)
	assert.Equal(t, again, e)
	assert.Equal(t, mark("v1", 3), m)
	bare := entry("r2", func(e *Entry) { e.Kind = "" })
	book(t, s, bare)
	b := read(t, s, Query{})
	require.Equal(t, []string{"r1", "r2"}, names(b))
	assert.Equal(t, KindRun, b.Entries[1].Kind, "the store knows what it books")
	b.Entries[0].Job = "changed"
	assert.Equal(t, "retrain-tide", read(t, s, Query{}).Entries[0].Job)
}

// suiteNotANumber: an entry that cannot be written is an error, and nothing of
// its booking goes in.
func suiteNotANumber(t *testing.T, open func(*testing.T) Store) {
	s := open(t)
	zero := unit.Mass(0)
	_, err := s.Book(ctx, []*Entry{entry("r1"), entry("r2", func(e *Entry) { e.Total = ptr(zero / zero) })}, nil)
	require.Error(t, err)
	assert.Contains(t, err.Error(), "run r2")
	assert.Empty(t, read(t, s, Query{}).Entries)
}
