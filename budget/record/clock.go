package record

import (
	"time"

	"budgetcheck/budget/unit"
)

// dayCache remembers the last date read: neighbouring lines share it.
type dayCache struct {
	date  [10]byte
	start unit.Instant
}

// parse reads an RFC 3339 time of the usual shape, with up to nine fractional
// digits. ok is false for all other texts; the general path judges those.
func (d *dayCache) parse(b []byte) (at unit.Instant, ok bool) {
	const shortest = len("2031-03-04T02:15:00Z")
	if len(b) < shortest || b[10] != 'T' || b[13] != ':' || b[16] != ':' {
		return 0, false
	}
	if string(b[:10]) != string(d.date[:]) && !d.load(b[:10]) {
		return 0, false
	}
	hour, okH := twoDigits(b[11:], 23)
	minute, okM := twoDigits(b[14:], 59)
	second, okS := twoDigits(b[17:], 59)
	nanos, rest, okF := fraction(b[19:])
	offset, okO := zone(rest)
	if !okH || !okM || !okS || !okF || !okO {
		return 0, false
	}
	seconds := int64(hour*3600+minute*60+second) - offset
	return d.start + unit.Instant(seconds*int64(time.Second)+nanos), true
}

// load reads a date with the standard library, which knows the calendar. Years
// at the edges of an Instant's range are left to the general path.
func (d *dayCache) load(date []byte) bool {
	t, err := time.Parse(time.DateOnly, string(date))
	if err != nil || t.Year() < 1700 || t.Year() > 2200 {
		return false
	}
	copy(d.date[:], date)
	d.start = unit.At(t)
	return true
}

func twoDigits(b []byte, most int) (int, bool) {
	if !isDigit(b[0]) || !isDigit(b[1]) {
		return 0, false
	}
	n := int(b[0]-'0')*10 + int(b[1]-'0')
	return n, n <= most
}

// fraction takes ".123" off b.
func fraction(b []byte) (nanos int64, rest []byte, ok bool) {
	if len(b) == 0 || b[0] != '.' {
		return 0, b, true
	}
	i, scale := 1, int64(time.Second)
	for ; i < len(b) && isDigit(b[i]); i++ {
		scale /= 10
		nanos += int64(b[i]-'0') * scale
	}
	return nanos, b[i:], i > 1 && i <= 10
}

// zone reads "Z" or "+01:00" in seconds east of UTC.
func zone(b []byte) (seconds int64, ok bool) {
	if len(b) == 1 && b[0] == 'Z' {
		return 0, true
	}
	if len(b) != 6 || b[3] != ':' || b[0] != '+' && b[0] != '-' {
		return 0, false
	}
	hour, okH := twoDigits(b[1:], 23)
	minute, okM := twoDigits(b[4:], 59)
	seconds = int64(hour*3600 + minute*60)
	if b[0] == '-' {
		seconds = -seconds
	}
	return seconds, okH && okM
}
