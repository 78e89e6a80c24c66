package unit

import (
	"fmt"
	"math"
	"strings"
	"time"
)

// Instant is a moment in nanoseconds since 1970-01-01T00:00:00Z, without leap
// seconds. Two writings of one moment in different zones are the same Instant.
type Instant int64

// The range of an Instant is that of its integer: years 1678 to 2262.
var (
	earliest = time.Unix(0, math.MinInt64)
	latest   = time.Unix(0, math.MaxInt64)
)

// At converts t, which must be within the range of an Instant.
func At(t time.Time) Instant { return Instant(t.UnixNano()) }

// ParseInstant reads an RFC 3339 time with its offset.
func ParseInstant(text string) (Instant, error) {
	t, err := time.Parse(time.RFC3339Nano, text)
	if err != nil || !strict(text) {
		return 0, fmt.Errorf("%q is not a time; write it with date, time and offset, like %q", clip(text), "2031-03-04T02:15:00Z")
	}
	if t.Before(earliest) || t.After(latest) {
		return 0, fmt.Errorf("%q is not a time between the years 1678 and 2262", clip(text))
	}
	return At(t), nil
}

// strict refuses what time.Parse lets pass beyond RFC 3339: an hour of one
// digit, a comma before the fraction, an offset of a day or of a whole hour in
// minutes (https://go.dev/issue/54580). text is one that it took.
func strict(text string) bool {
	offset := text[len(text)-len("07:00"):]
	inRange := strings.HasSuffix(text, "Z") || offset[:2] < "24" && offset[3:] < "60"
	return text[len("2006-01-02T15")] == ':' && !strings.Contains(text, ",") && inRange
}

// Time is the instant in UTC.
func (i Instant) Time() time.Time { return time.Unix(0, int64(i)).UTC() }

// Sub is the span from o to i, cut at the range of a Duration: one that wrapped
// around would turn a span of centuries into a negative one.
func (i Instant) Sub(o Instant) Duration {
	if d := i - o; (d > 0) == (i > o) {
		return Duration(d)
	}
	return extreme[Duration](i > o)
}

// Add is the instant d later, cut at the range of an Instant.
func (i Instant) Add(d Duration) Instant {
	if sum := i + Instant(d); (sum > i) == (d > 0) {
		return sum
	}
	return extreme[Instant](d > 0)
}

// Hour is the hour of UTC that holds the instant, counted from 1970.
func (i Instant) Hour() int64 {
	hour := int64(i) / int64(Hour)
	if int64(i)%int64(Hour) < 0 { // before 1970
		hour--
	}
	return hour
}

// HourStart is when an hour counted from 1970 starts. Beyond the range of an
// Instant it wraps around.
func HourStart(hour int64) Instant { return Instant(hour * int64(Hour)) }

func extreme[T ~int64](high bool) T {
	if high {
		return math.MaxInt64
	}
	return math.MinInt64
}

func (i Instant) String() string { return i.Time().Format(time.RFC3339Nano) }

// MarshalText writes RFC 3339 in UTC.
func (i Instant) MarshalText() ([]byte, error) { return []byte(i.String()), nil }

// UnmarshalText reads RFC 3339.
func (i *Instant) UnmarshalText(text []byte) error { return set(i, string(text), ParseInstant) }
