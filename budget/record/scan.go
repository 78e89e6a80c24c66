package record

import (
	"math"

	"budgetcheck/budget/unit"
)

// fields are the values of a line that the fast path understands.
type fields struct {
	kind          Kind
	at            unit.Instant
	meter         []byte
	value, wrap   float64
	seen          uint8
	valueIsJoules bool
}

const (
	seenKind = 1 << iota
	seenAt
	seenMeter
	seenValue
	seenWrap
)

// scanner reads power and energy lines, nearly all of a record, without
// allocating. Whatever it is not sure of, it leaves to the general path.
type scanner struct {
	b   []byte
	pos int
	day dayCache
}

// scan reads one line. ok is false for every line that is not a plain power or
// energy line with the keys of its kind, each once; nothing is judged here.
func (s *scanner) scan(line []byte) (f fields, ok bool) {
	s.b, s.pos = line, 0
	if !s.next('{') {
		return f, false
	}
	for {
		key, ok := s.text()
		if !ok || !s.next(':') || !s.field(&f, key) {
			return f, false
		}
		if s.next(',') {
			continue
		}
		return f, s.next('}') && s.atEnd() && f.complete()
	}
}

// complete tells whether the keys seen are those of the line's kind, with
// values that need no remark.
func (f *fields) complete() bool {
	if len(f.meter) == 0 || f.seen&seenWrap != 0 && f.wrap == 0 {
		return false
	}
	const needed = seenKind | seenAt | seenMeter | seenValue
	switch f.kind {
	case KindPower:
		return f.seen == needed && !f.valueIsJoules
	case KindEnergy:
		return f.seen&^seenWrap == needed && f.valueIsJoules
	}
	return false
}

func (s *scanner) field(f *fields, key []byte) (ok bool) {
	var bit uint8
	switch string(key) {
	case "k":
		bit = seenKind
		var word []byte
		if word, ok = s.text(); ok {
			f.kind = plainKind(word)
		}
	case "at":
		bit = seenAt
		var text []byte
		if text, ok = s.text(); ok {
			f.at, ok = s.day.parse(text)
		}
	case "meter":
		bit = seenMeter
		f.meter, ok = s.text()
	case "w", "j":
		bit = seenValue
		f.valueIsJoules = key[0] == 'j'
		f.value, ok = s.number()
	case "wrap_j":
		bit = seenWrap
		f.wrap, ok = s.number()
	}
	if f.seen&bit != 0 {
		return false // twice: the general path says so
	}
	f.seen |= bit
	return ok
}

func plainKind(word []byte) Kind {
	switch string(word) {
	case "power":
		return KindPower
	case "energy":
		return KindEnergy
	}
	return KindUnknown
}

// next skips white space and takes c if it stands there.
func (s *scanner) next(c byte) bool {
	s.space()
	if s.pos < len(s.b) && s.b[s.pos] == c {
		s.pos++
		return true
	}
	return false
}

func (s *scanner) space() {
	for s.pos < len(s.b) && isSpace(s.b[s.pos]) {
		s.pos++
	}
}

func isSpace(c byte) bool { return c == ' ' || c == '\t' || c == '\r' || c == '\n' }

func (s *scanner) atEnd() bool {
	s.space()
	return s.pos == len(s.b)
}

// text takes a string of printable ASCII without escapes.
func (s *scanner) text() ([]byte, bool) {
	if !s.next('"') {
		return nil, false
	}
	b, start := s.b, s.pos
	for i := start; i < len(b); i++ {
		switch c := b[i]; {
		case c == '"':
			s.pos = i + 1
			return b[start:i], true
		case c == '\\' || c < 0x20 || c >= 0x7f:
			return nil, false
		}
	}
	return nil, false
}

// number takes a JSON number that converts exactly: at most 15 significant
// digits scaled by a power of ten that a float64 holds exactly, so that one
// division rounds correctly (Clinger 1990, PLDI, from memory). Other numbers
// are left to the general path.
func (s *scanner) number() (float64, bool) {
	s.space()
	b, i := s.b, s.pos
	start := i
	var mantissa uint64
	for ; i < len(b) && isDigit(b[i]); i++ {
		mantissa = mantissa*10 + uint64(b[i]-'0')
	}
	whole := i - start
	if whole == 0 || whole > 1 && b[start] == '0' {
		return 0, false // signs and leading zeros
	}
	fraction := 0
	if i < len(b) && b[i] == '.' {
		for i++; i < len(b) && isDigit(b[i]); i++ {
			mantissa = mantissa*10 + uint64(b[i]-'0')
			fraction++
		}
		if fraction == 0 {
			return 0, false
		}
	}
	if whole+fraction > 15 || i < len(b) && (b[i] == 'e' || b[i] == 'E') {
		return 0, false
	}
	s.pos = i
	return float64(mantissa) / powersOfTen[fraction], true
}

var powersOfTen = func() (p [16]float64) {
	for i := range p {
		p[i] = math.Pow10(i)
	}
	return p
}()

func isDigit(c byte) bool { return c-'0' < 10 }
