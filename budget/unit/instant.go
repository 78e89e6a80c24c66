package unit

import (
	"fmt"
	"math"
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
	if err != nil {
		return 0, fmt.Errorf("%q is not a time; write it with date, time and offset, like %q", clip(text), "2031-03-04T02:15:00Z")
	}
	if t.Before(earliest) || t.After(latest) {
		return 0, fmt.Errorf("%q is not a time between the years 1678 and 2262", clip(text))
	}
	return At(t), nil
}

// Time is the instant in UTC.
func (i Instant) Time() time.Time { return time.Unix(0, int64(i)).UTC() }

// Sub is the span from o to i.
func (i Instant) Sub(o Instant) Duration { return Duration(i - o) }

// Add is the instant d later.
func (i Instant) Add(d Duration) Instant { return i + Instant(d) }

func (i Instant) String() string { return i.Time().Format(time.RFC3339Nano) }

// MarshalText writes RFC 3339 in UTC.
func (i Instant) MarshalText() ([]byte, error) { return []byte(i.String()), nil }

// UnmarshalText reads RFC 3339.
func (i *Instant) UnmarshalText(text []byte) error { return set(i, string(text), ParseInstant) }
