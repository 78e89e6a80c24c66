package footprint_test

import (
	"bytes"
	"encoding/json"
	"fmt"
	"slices"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/record"
)

func digest(t test, text []byte) string {
	return weighText(t, text, plain(nil), method).Digest
}

// rewritten writes the same values again: keys in another order, spaces
// between them, meters under other names.
func rewritten(t *rapid.T, text []byte) []byte {
	var b bytes.Buffer
	for line := range bytes.Lines(text) {
		var fields map[string]json.RawMessage
		require.NoError(t, json.Unmarshal(line, &fields))
		if m, ok := fields["meter"]; ok {
			fields["meter"] = bytes.Replace(m, []byte(`"m`), []byte(`"gpu \u00e9 `), 1)
		}
		space := rapid.SampledFrom([]string{"", " ", "\t ", "   "}).Draw(t, "space")
		keys := make([]string, 0, len(fields))
		for key := range fields {
			keys = append(keys, key)
		}
		slices.Sort(keys)
		var members []string
		for _, key := range rapid.Permutation(keys).Draw(t, "keys") {
			members = append(members, fmt.Sprintf("%s%q%s:%s%s", space, key, space, space, fields[key]))
		}
		fmt.Fprintf(&b, "%s{%s%s}%s\n", space, strings.Join(members, space+","), space, space)
	}
	return b.Bytes()
}

// TestDigestOfValues: how energy lines are written does not matter, nor what
// the meters are called, so that a copy under another run's name shows.
func TestDigestOfValues(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d := drawRecord(t)
		s := d.sheet(t)
		want := digest(t, s.text.Bytes())
		require.Len(t, want, 64)
		assert.Equal(t, want, digest(t, rewritten(t, s.text.Bytes())))
		other := d.sheet(t, func(o *record.Open) { o.Run, o.Host, o.Commit, o.Site = "another", "h9", "c0ffee", "quay-south" })
		assert.Equal(t, want, digest(t, other.text.Bytes()))
	})
}

// TestDigestSeesEveryValue: any change in an energy line is another digest.
func TestDigestSeesEveryValue(t *testing.T) {
	base := `{"k":"open","format":1,"run":"r1","job":"retrain-tide","at":"2031-03-04T02:00:00Z"}
{"k":"power","at":"2031-03-04T02:00:00Z","meter":"a","w":1}
{"k":"energy","at":"2031-03-04T02:00:10Z","meter":"b","j":1000,"wrap_j":262144}
{"k":"energy","at":"2031-03-04T02:00:20Z","meter":"b","j":2000}
{"k":"power","at":"2031-03-04T02:00:20Z","meter":"c","w":5}
{"k":"used","from":"2031-03-04T02:00:00Z","to":"2031-03-04T02:01:00Z","kwh":0.5,"how":"measured"}
{"k":"work","at":"2031-03-04T02:01:00Z","unit":"step","done":10}
{"k":"close","at":"2031-03-04T02:01:00Z","outcome":"ok"}
`
	want := digest(t, []byte(base))
	seen := map[string]string{want: "the record itself"}
	for name, change := range map[string][2]string{
		"a power":                {`"w":1}`, `"w":1.0000000000000002}`},
		"its time":               {`02:00:00Z","meter":"a"`, `02:00:00.000000001Z","meter":"a"`},
		"a counter's reading":    {`"j":2000`, `"j":2001`},
		"its time too":           {`02:00:20Z","meter":"b"`, `02:00:21Z","meter":"b"`},
		"its wrap":               {`262144`, `262143`},
		"no wrap":                {`,"wrap_j":262144`, ``},
		"a total":                {`"kwh":0.5`, `"kwh":0.6`},
		"a total's start":        {`"from":"2031-03-04T02:00:00Z"`, `"from":"2031-03-04T02:00:01Z"`},
		"a total's end":          {`"to":"2031-03-04T02:01:00Z"`, `"to":"2031-03-04T02:00:59Z"`},
		"a total's kind":         {`"how":"measured"`, `"how":"estimated"`},
		"a reading's meter":      {`"meter":"c"`, `"meter":"a"`},
		"a counter made a power": {`{"k":"power","at":"2031-03-04T02:00:20Z","meter":"c","w":5}`, `{"k":"energy","at":"2031-03-04T02:00:20Z","meter":"c","j":5}`},
		"a line left out":        {`{"k":"power","at":"2031-03-04T02:00:20Z","meter":"c","w":5}` + "\n", ``},
	} {
		require.Equal(t, 1, strings.Count(base, change[0]), name)
		got := digest(t, []byte(strings.Replace(base, change[0], change[1], 1)))
		assert.NotContains(t, seen, got, name)
		seen[got] = name
	}
	for name, change := range map[string][2]string{
		"work":        {`"done":10`, `"done":11`},
		"the outcome": {`"ok"`, `"failed"`},
		"the job":     {`retrain-tide`, `check-tide`},
	} {
		assert.Equal(t, want, digest(t, []byte(strings.Replace(base, change[0], change[1], 1))), name)
	}
}

// TestDigestOfLongRecord: lines far from the start and from the end count like
// any other.
func TestDigestOfLongRecord(t *testing.T) {
	const n = 3000
	write := func(changed int) string {
		s := open(t)
		for k := range n {
			w := 100.0
			if k == changed {
				w = 101
			}
			s.power(float64(k), "m", w)
		}
		return digest(t, s.close(n).text.Bytes())
	}
	seen := map[string]int{}
	for _, changed := range []int{-1, 0, 1, 211, 214, 215, 216, 1500, n - 1} {
		got := write(changed)
		assert.NotContains(t, seen, got, changed)
		seen[got] = changed
	}
}

// TestRepeatsAreNoValues: a reading written twice is one reading.
func TestRepeatsAreNoValues(t *testing.T) {
	once := open(t).power(0, "m", 100).power(60, "m", 120).close(60).run(plain(flat(400)), method)
	twice := open(t).power(0, "m", 100).power(0, "m", 100).power(60, "m", 120).power(60, "m", 120).close(60).run(plain(flat(400)), method)
	assert.Equal(t, once.Pieces[0].Digest, twice.Pieces[0].Digest)
	assert.Equal(t, once.Operational, twice.Operational)
	assert.Equal(t, []string{"run.ndjson: 2 repeated samples counted once"}, notesBut(twice, once))
}

// notesBut are the notes of a run that another does not have.
func notesBut(r, other *footprint.Run) (notes []string) {
	for _, n := range r.Notes {
		if !slices.Contains(other.Notes, n) {
			notes = append(notes, n)
		}
	}
	return notes
}
