package unit

import (
	"fmt"
	"math"
	"strings"
	"time"
)

// Duration is a span of time. Written durations may use days, weeks and years
// of 365 days (ISO/IEC 21031:2024 counts a lifetime so).
type Duration time.Duration

// Common spans.
const (
	Second = Duration(time.Second)
	Minute = Duration(time.Minute)
	Hour   = Duration(time.Hour)
	Day    = 24 * Hour
	Year   = 365 * Day
)

var durations = scale{
	what: "a duration", example: "72h",
	prints: []step{{"ms", 1, 1e3}, {"s", 1, 1}, {"min", 60, 1}, {"h", 3600, 1}, {"d", 86400, 1}, {"y", 365 * 86400, 1}},
	accepts: []step{{"sec", 1, 1}, {"m", 60, 1}, {"w", 7 * 86400, 1}, {"day", 86400, 1}, {"days", 86400, 1},
		{"year", 365 * 86400, 1}, {"years", 365 * 86400, 1}},
}

// ParseDuration reads text like "2m", "1h30m", "72h", "4y". "m" is a minute.
func ParseDuration(text string) (Duration, error) {
	rest := strings.TrimSpace(text)
	var seconds float64
	for first := true; first || rest != ""; first = false {
		piece := rest[:pieceEnd(rest)]
		rest = strings.TrimSpace(rest[len(piece):])
		v, err := durations.parse(piece)
		if err != nil && piece != strings.TrimSpace(text) {
			return 0, fmt.Errorf("%q: %w", clip(text), err)
		}
		if err != nil {
			return 0, err
		}
		seconds += v
	}
	nanos := math.Round(seconds * 1e9)
	if nanos >= math.MaxInt64 {
		return 0, fmt.Errorf("%q is not a duration: longer than 292 years; write it like %q", clip(text), durations.example)
	}
	return Duration(nanos), nil
}

// pieceEnd is the end of the first number and unit in text, or of text where
// no number starts it.
func pieceEnd(text string) int {
	end := numberEnd(text)
	if end == 0 {
		return len(text)
	}
	for end < len(text) && (text[end] < '0' || text[end] > '9') {
		end++
	}
	return end
}

// Seconds is the length in seconds.
func (d Duration) Seconds() float64 { return time.Duration(d).Seconds() }

// Text prints the duration with the given number of significant figures.
func (d Duration) Text(digits int) string { return durations.text(d.Seconds(), digits) }

func (d Duration) String() string { return d.Text(3) }

// Set parses text into the value.
func (d *Duration) Set(text string) error { return set(d, text, ParseDuration) }
