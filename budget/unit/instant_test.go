package unit

import (
	"encoding/json"
	"math"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"
)

// TestOneMomentInManyWritings: offsets tell where a clock hung, not when.
func TestOneMomentInManyWritings(t *testing.T) {
	want := At(time.Date(2031, 3, 4, 2, 15, 0, 0, time.UTC))
	same(t, ParseInstant, want,
		"2031-03-04T02:15:00Z", "2031-03-04T02:15:00+00:00", "2031-03-04T02:15:00-00:00", "2031-03-04T02:15:00.000000000Z",
		"2031-03-04T03:15:00+01:00", "2031-03-03T21:15:00-05:00", "2031-03-04T07:45:00+05:30", "2031-03-05T02:14:00+23:59")
	same(t, ParseInstant, want+123_456_789, "2031-03-04T02:15:00.123456789Z", "2031-03-04T03:15:00.123456789+01:00")
	same(t, ParseInstant, want+500_000_000, "2031-03-04T02:15:00.5Z", "2031-03-04T02:15:00.50Z")
	same(t, ParseInstant, At(time.Date(2032, 2, 29, 0, 0, 0, 0, time.UTC)), "2032-02-29T00:00:00Z", "2032-02-28T23:00:00-01:00")
}

// TestInstantRefused: RFC 3339 with its offset and nothing else; also what
// time.Parse lets pass beyond it (https://go.dev/issue/54580).
func TestInstantRefused(t *testing.T) {
	for _, text := range []string{"", "now", "2031-03-04", "02:15:00Z", "2031-03-04T02:15:00", "2031-03-04T02:15Z", "2031-03-04 02:15:00Z",
		"2031-02-29T00:00:00Z", "2031-13-01T00:00:00Z", "2031-03-04T24:00:00Z", "2031-03-04T02:60:00Z", "2031-03-04T02:15:61Z",
		"2031-03-04T2:15:00Z", "2031-03-04T02:15:00,5Z", "2031-03-04T02:15:00.Z", "2031-03-04T02:15:00+24:00", "2031-03-04T02:15:00+01:60",
		"2031-03-04T02:15:00+0100", "2031-03-04T02:15:00+01", "2031-03-04T02:15:00 UTC", "+2031-03-04T02:15:00Z", "1930360500", " 2031-03-04T02:15:00Z"} {
		_, err := ParseInstant(text)
		if assert.Error(t, err, text) {
			assert.Contains(t, err.Error(), `is not a time; write it with date, time and offset, like "2031-03-04T02:15:00Z"`)
		}
	}
}

// TestInstantRange: an Instant is 64 bits of nanoseconds; a time beyond would
// wrap around silently.
func TestInstantRange(t *testing.T) {
	same(t, ParseInstant, Instant(math.MinInt64), "1677-09-21T00:12:43.145224192Z", "1677-09-21T01:12:43.145224192+01:00")
	same(t, ParseInstant, Instant(math.MaxInt64), "2262-04-11T23:47:16.854775807Z")
	same(t, ParseInstant, Instant(-1), "1969-12-31T23:59:59.999999999Z")
	for _, text := range []string{"1677-09-21T00:12:43.145224191Z", "2262-04-11T23:47:16.854775808Z", "2262-04-11T23:47:16.9-01:00",
		"0001-01-01T00:00:00Z", "9999-12-31T23:59:59Z"} {
		_, err := ParseInstant(text)
		assert.ErrorContains(t, err, "is not a time between the years 1678 and 2262", text)
	}
}

// TestSpansDoNotWrap: a span longer than a Duration holds is cut at its range.
// A wrapped one would be negative, and so would the emissions of such a run.
func TestSpansDoNotWrap(t *testing.T) {
	const first, last = Instant(math.MinInt64), Instant(math.MaxInt64)
	assert.Equal(t, Duration(math.MaxInt64), last.Sub(first))
	assert.Equal(t, Duration(math.MinInt64), first.Sub(last))
	assert.Equal(t, Duration(0), first.Sub(first))
	assert.Equal(t, last, last.Add(Hour))
	assert.Equal(t, first, first.Add(-Hour))
	assert.Equal(t, Instant(-1), last.Add(Duration(math.MinInt64)))
}

func TestSpansAgreeWithTheStandardLibrary(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a, b := Instant(rapid.Int64().Draw(t, "a")), Instant(rapid.Int64().Draw(t, "b"))
		assert.Equal(t, a.Time().Sub(b.Time()), time.Duration(a.Sub(b)))
		if d := a.Sub(b); d > math.MinInt64 && d < math.MaxInt64 {
			assert.Equal(t, a, b.Add(d))
		}
	})
}

func TestInstantRoundTrips(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		want := Instant(rapid.Int64().Draw(t, "ns"))
		got, err := ParseInstant(want.String())
		require.NoError(t, err)
		assert.Equal(t, want, got)

		text, err := json.Marshal(want)
		require.NoError(t, err)
		var back Instant
		require.NoError(t, json.Unmarshal(text, &back))
		assert.Equal(t, want, back)
	})
}

func TestInstantPrintsUTC(t *testing.T) {
	at, err := ParseInstant("2031-03-04T03:15:00.25+01:00")
	require.NoError(t, err)
	assert.Equal(t, "2031-03-04T02:15:00.25Z", at.String())
	assert.Error(t, at.UnmarshalText([]byte("tomorrow")))
	assert.Equal(t, "2031-03-04T02:15:00.25Z", at.String(), "a refused text leaves the value")
}

// TestHour: an hour holds its start and not its end, also before 1970.
func TestHour(t *testing.T) {
	for _, hour := range []int64{-3, -1, 0, 1, 500_000} {
		start := HourStart(hour)
		for at, want := range map[Instant]int64{start: hour, start - 1: hour - 1, start.Add(Hour) - 1: hour, start.Add(Hour): hour + 1} {
			if got := at.Hour(); got != want {
				t.Errorf("%s is in hour %d, want %d", at, got, want)
			}
		}
	}
}
