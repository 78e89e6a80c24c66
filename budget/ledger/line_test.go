package ledger

import (
	"bytes"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/record"
)

// TestUnreadableLines: what cannot be used is refused, and the refusal says why.
func TestUnreadableLines(t *testing.T) {
	whole := string(line{entry: entry("r1")}.append(nil))
	for text, want := range map[string]string{
		"":                              "cannot be read",
		"[]":                            "cannot be read",
		"{}":                            "no k",
		whole[:len(whole)/2]:            "cannot be read",
		whole + whole:                   "cannot be read",
		`{"k":"run"}`:                   "no run",
		`{"k":"run","run":"r","end":1}`: "cannot be read",
		`{"k":"run","run":"r"}`:         "0 parts",
		`{"k":"run","run":"r","parts":[{}],"start":"2031-03-02T00:00:00Z","end":"2031-03-01T00:00:00Z"}`: "before it starts",
		`{"k":"run","run":"r","parts":[{}],"hours":[{"from":"2031-03-01T00:00:00Z","kwh":-1}]}`:          "below zero",
		`{"k":"run","run":"r","parts":[{}],"hours":[{"from":"2031-03-01T00:00:00Z","kwh":1,"g":-1}]}`:    "below zero",
		`{"k":"release","at":"yesterday"}`: "not a time",
		`{"k":"refund"}`:                   `"refund" is of a kind`,
	} {
		_, err := parse([]byte(text))
		assert.ErrorContains(t, err, want, text)
	}
}

// TestVetting: everything that should not be in the books is told, with its
// line.
func TestVetting(t *testing.T) {
	booked := func(e *Entry) line { return line{entry: e, booked: e.BookedAt} }
	first := entry("r1")
	later := func(e *Entry) { e.BookedAt = hours(5) }
	fixed := entry("r1", energy(2), correcting(first), later)
	for name, c := range map[string]struct {
		lines []line
		want  []string
	}{
		"nothing":        {[]line{booked(first), booked(fixed), {mark: mark("v1", 5), booked: hours(5)}}, nil},
		"twice":          {[]line{booked(first), booked(first)}, []string{"books:2: run r1, attempt 1 is there twice; nothing: the first one counts"}},
		"other content":  {[]line{booked(first), booked(entry("r1", energy(2)))}, []string{"books:2: run r1, attempt 1 is there twice with different content"}},
		"no such entry":  {[]line{booked(fixed)}, []string{"books:1: run r1, attempt 1 corrects entry " + first.ID() + ", which is not in force"}},
		"corrected once": {[]line{booked(first), booked(fixed), booked(entry("r1", energy(3), correcting(first), later))}, []string{"books:3: run r1"}},
		"clock":          {[]line{booked(fixed), booked(first)}, []string{"books:1: ", "books:2: booked_at goes back from 2031-03-01T05:00:00Z to 2031-03-01T01:01:00Z", "books:2: run r1"}},
		"too early":      {[]line{booked(entry("r1", func(e *Entry) { e.BookedAt = e.Start }))}, []string{"books:1: run r1 was booked at 2031-03-01T00:00:00Z, before it ended at 2031-03-01T01:00:00Z"}},
		"mark too early": {[]line{{mark: mark("v1", 5), booked: hours(4)}}, []string{"books:1: release v1 was booked"}},
		"longer":         {[]line{booked(entry("r1", unclosed)), booked(entry("r1", lasting(0, 2)))}, nil},
	} {
		v := newVetting()
		v.page("books")
		for _, l := range c.lines {
			v.line(bytes.TrimSuffix(l.append(nil), []byte("\n")))
		}
		got := v.findings.Lines()
		if assert.Len(t, got, len(c.want), "%s: %v", name, got) {
			for n := range got {
				assert.Contains(t, got[n], c.want[n], name)
			}
		}
	}
	v := newVetting()
	v.page("books")
	v.line([]byte(`{"k":"refund"}`))
	v.line([]byte("lost"))
	require.Equal(t, 2, v.findings.Len())
	assert.Contains(t, v.findings.Lines()[0], `books:1: the line "refund" is of a kind that this version does not know; use the version`)
	assert.Contains(t, v.findings.Lines()[1], "books:2: the line cannot be read")
}

// FuzzLines: reading never fails on foreign text; what is read can be written
// and read again; and the start of a line never tells otherwise than the whole
// of it, where the line is one that was written here.
func FuzzLines(f *testing.F) {
	full := entry("r2", part("a", 2), unclosed, unpriced, func(e *Entry) { e.Corrects, e.Why, e.Labels = "ff", "late", map[string]string{"run": "x"} })
	for _, l := range []line{{entry: entry("r1")}, {entry: full, more: 2}, {mark: mark("v1", 5), booked: hours(5)}} {
		f.Add(l.append(nil))
	}
	f.Add([]byte(`{"k":"run","account":"main","booked_at":"2031-03-01T00:00:00Z","run":"r","account":"other","RUN":"s","parts":[{}]}`))
	f.Add([]byte(`{"k":"run","run":"r","parts":[{}],"hours":[{"from":"2031-03-01T00:00:00Z","kwh":1e308},{"from":"2031-03-01T00:00:00Z","kwh":1e308}],"closed":true}`))
	f.Add([]byte("{\"k\":\"run\"}\n\n{\"k\":\"release\"}\n\x00\xff"))
	f.Fuzz(func(t *testing.T, text []byte) {
		g, v, d := gather(Query{}), newVetting(), &draft{runs: map[string]bool{"r1": true}, page: map[*Entry]*page{}, known: map[Mark]bool{}}
		for one := range lines(text) {
			g.line(one, "books", func() int { return 1 })
			v.line(one)
			d.read(one, nil)
			again(t, one)
		}
		b := g.done()
		keys := map[Key]bool{}
		for _, e := range b.Entries {
			require.False(t, keys[e.Key()], "two entries of a key are in force")
			keys[e.Key()] = true
			require.LessOrEqual(t, e.Start, e.End)
			e.Restore("books", footprint.Method{}, func(*record.Open) footprint.Facts { return footprint.Facts{} })
		}
		s := b.Spent(Window{From: hours(0), To: hours(24)})
		for _, l := range s.Lines {
			require.GreaterOrEqual(t, float64(l.Facility), 0.0)
			require.GreaterOrEqual(t, float64(l.Operational), 0.0)
		}
		from, err := seek(bytes.NewReader(text), int64(len(text)), hours(0))
		require.NoError(t, err)
		require.LessOrEqual(t, from, int64(len(text)))
	})
}

// again writes and reads a line.
func again(t *testing.T, text []byte) {
	l, err := parse(text)
	if err != nil {
		return
	}
	back, err := parse(bytes.TrimSuffix(l.append(nil), []byte("\n")))
	require.NoError(t, err)
	require.Equal(t, l.append(nil), back.append(nil))
	h, sure := scanHead(text)
	if !sure || !bytes.Equal(l.append(nil), append(bytes.Clone(text), '\n')) {
		return
	}
	require.Equal(t, []string{l.entry.Repository, l.entry.Account, l.entry.Corrects, l.entry.Run.Run},
		[]string{string(h.repository), string(h.account), string(h.corrects), string(h.run)})
	at, ok := bookedAt(text)
	require.True(t, ok)
	require.Equal(t, l.booked, at)
}
