package record

import (
	"errors"
	"fmt"
	"io"
	"regexp"
	"strings"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/unit"
)

// start is when the records of the tests open.
var start = unit.At(time.Date(2031, 3, 4, 2, 15, 0, 0, time.UTC))

// at is a moment some seconds after start, as it stands in a line.
func at(seconds int) string {
	return `"` + start.Add(unit.Duration(seconds)*unit.Second).String() + `"`
}

// The lines of the tests: a night's retraining of a harbour's tide forecast.
const opening = `{"k":"open","format":1,"run":"r1","job":"retrain-tide","stage":"training","at":"2031-03-04T02:15:00Z","site":"quay-north","machine":"quad"}`

func power(seconds int, meter string, w any) string {
	return fmt.Sprintf(`{"k":"power","at":%s,"meter":%q,"w":%v}`, at(seconds), meter, w)
}

func energy(seconds int, meter string, j any) string {
	return fmt.Sprintf(`{"k":"energy","at":%s,"meter":%q,"j":%v}`, at(seconds), meter, j)
}

func wrapping(seconds int, meter string, j, wrap any) string {
	return fmt.Sprintf(`{"k":"energy","at":%s,"meter":%q,"j":%v,"wrap_j":%v}`, at(seconds), meter, j, wrap)
}

func used(from, to int, kwh any) string {
	return fmt.Sprintf(`{"k":"used","from":%s,"to":%s,"kwh":%v,"how":"measured"}`, at(from), at(to), kwh)
}

func work(seconds int, unit string, done any) string {
	return fmt.Sprintf(`{"k":"work","at":%s,"unit":%q,"done":%v}`, at(seconds), unit, done)
}

func closing(seconds int, outcome string) string {
	return fmt.Sprintf(`{"k":"close","at":%s,"outcome":%q}`, at(seconds), outcome)
}

func text(lines ...string) string { return strings.Join(lines, "\n") + "\n" }

// reading is everything that a Reader says about one record.
type reading struct {
	lines    []Line
	meters   []string
	findings []string
	unknown  []string
	notes    []string
}

// tryRead reads to the end or to a failure, and checks what must hold for
// every record: messages have a place, a fault and a remedy, lines have numbers.
func tryRead(t require.TestingT, in io.Reader) (got reading, err error) {
	r, err := NewReader(in, "tide.ndjson")
	if err != nil {
		return got, err
	}
	for err == nil {
		var l *Line
		if l, err = r.Next(); err == nil {
			got.lines = append(got.lines, *l)
		}
	}
	if errors.Is(err, io.EOF) {
		err = nil
	}
	got.meters, got.notes = r.Meters(), r.Notes()
	got.findings, got.unknown = r.Findings().Lines(), r.Unknown().Lines()
	got.check(t)
	require.NoError(t, r.Close())
	return got, err
}

var (
	message = regexp.MustCompile(`^tide\.ndjson:[1-9]\d*: [^;].*; .+$`)
	more    = regexp.MustCompile(`^tide\.ndjson: \d+ more like these$`)
)

func (got *reading) check(t require.TestingT) {
	for _, m := range append(got.findings, got.unknown...) {
		assert.True(t, message.MatchString(m) || more.MatchString(m), "not file:line: what; do: %s", m)
	}
	for _, note := range got.notes {
		assert.Regexp(t, `^tide\.ndjson(:\d+)?: .`, note)
	}
	last := 0
	for _, l := range got.lines {
		assert.Greater(t, l.No, last)
		last = l.No
	}
}

func read(t require.TestingT, record string) reading {
	got, err := tryRead(t, strings.NewReader(record))
	require.NoError(t, err)
	return got
}

// numbers are the numbers of the lines that counted.
func (got *reading) numbers() []int {
	numbers := []int{}
	for _, l := range got.lines {
		numbers = append(numbers, l.No)
	}
	return numbers
}

// refusal is a record of which one line is refused.
type refusal struct {
	name   string
	record string
	counts []int  // numbers of the lines that count
	want   string // the message, without the file
}

func refuses(t *testing.T, cases []refusal) {
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			got := read(t, c.record)
			assert.Equal(t, []string{"tide.ndjson:" + c.want}, got.findings)
			assert.Equal(t, c.counts, got.numbers())
		})
	}
}
