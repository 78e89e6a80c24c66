package finding

import (
	"fmt"
	"testing"

	"github.com/stretchr/testify/assert"
)

func TestString(t *testing.T) {
	for _, c := range []struct {
		finding Finding
		want    string
	}{
		{Finding{"tide.ndjson", 7, "\"w\" is missing", "write a power in W"}, "tide.ndjson:7: \"w\" is missing; write a power in W"},
		{Finding{"tide.ndjson", 0, "the record is empty", "run the job"}, "tide.ndjson: the record is empty; run the job"},
		{Finding{"", 0, "no policy", "write one"}, "no policy; write one"},
		{Finding{"", 7, "no policy", ""}, "no policy"},
		{Finding{"tide.ndjson", 7, "torn", ""}, "tide.ndjson:7: torn"},
	} {
		assert.Equal(t, c.want, c.finding.String())
	}
}

func TestEmptyList(t *testing.T) {
	var l List
	assert.Zero(t, l.Len())
	assert.Empty(t, l.Lines())
}

// TestLines: by file, then by line as a number, then in the order of finding;
// and each said once, also when another of its line was found in between.
func TestLines(t *testing.T) {
	var l List
	for _, f := range []Finding{
		{"b.ndjson", 2, "one", ""},
		{"a.ndjson", 10, "two", ""},
		{"a.ndjson", 9, "three", ""},
		{"a.ndjson", 9, "first", ""},
		{"a.ndjson", 9, "three", ""},
		{"a.ndjson", 9, "three", "do"},
		{"", 0, "no file", ""},
		{"b.ndjson", 2, "one", ""},
	} {
		l.Add(f)
	}
	assert.Equal(t, []string{
		"no file",
		"a.ndjson:9: three", "a.ndjson:9: first", "a.ndjson:9: three; do",
		"a.ndjson:10: two",
		"b.ndjson:2: one",
	}, l.Lines())
	assert.Equal(t, 8, l.Len())
	assert.Equal(t, "b.ndjson:2: one", l.First().String())
	assert.Equal(t, l.Lines(), l.Lines(), "reading a list does not change it")
}

// TestBounded: a record of a million bad lines gives a short list and a count,
// at the threshold and beside it.
func TestBounded(t *testing.T) {
	for n, last := range map[int]string{
		Kept - 1:  "tide.ndjson:19: bad",
		Kept:      "tide.ndjson:20: bad",
		Kept + 1:  "tide.ndjson: 1 more like these",
		1_000_000: "tide.ndjson: 999980 more like these",
	} {
		var l List
		for i := range n {
			l.Add(Finding{"tide.ndjson", i + 1, "bad", ""})
		}
		lines := l.Lines()
		assert.Equal(t, n, l.Len())
		assert.Equal(t, last, lines[len(lines)-1])
		assert.Len(t, lines, min(n, Kept+1))
		assert.LessOrEqual(t, cap(l.kept), 2*Kept)
	}
}

func TestMoreWithoutAFile(t *testing.T) {
	var l List
	for i := range Kept + 3 {
		l.Add(Finding{What: fmt.Sprint("bad ", i)})
	}
	assert.Equal(t, "3 more like these", l.Lines()[Kept])
}

// TestJoin: what several readings of one input found is there once.
func TestJoin(t *testing.T) {
	var a, b List
	a.Add(Finding{File: "books.ndjson", Line: 1, What: "torn"})
	b.Add(Finding{File: "books.ndjson", Line: 1, What: "torn"})
	b.Add(Finding{File: "books.ndjson", Line: 2, What: "torn"})
	a.Join(&b)
	assert.Equal(t, []string{"books.ndjson:1: torn", "books.ndjson:2: torn"}, a.Lines())
}
