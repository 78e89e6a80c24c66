package record

import (
	"bytes"
	"encoding/json"

	"budgetcheck/budget/unit"
)

// fields are the values of a line that the fast path understands.
type fields struct {
	kind          Kind
	at            unit.Instant
	meter         []byte
	value, wrap   float64
	seen          uint8 // of the bits below
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
	b      []byte
	pos    int
	day    dayCache
	marks  []mark   // where the values of the line are that shapes leave open
	shapes [2]shape // of the latest power line and of the latest energy line
}

// scan reads one line into f. ok is false for every line that is not a plain
// power or energy line with the keys of its kind, each once, and with plain
// values of those that are ignored; nothing is judged here.
func (s *scanner) scan(line []byte, f *fields) (ok bool) {
	const longest = 4096 // bytes of a line whose shape is worth keeping
	for i := range s.shapes {
		if s.again(&s.shapes[i], line, f) {
			return true
		}
	}
	if ok = s.keys(line, f); ok && len(line) <= longest {
		s.shapes[f.kind-KindPower].learn(line, s.marks, f)
	}
	return ok
}

// keys reads a line key by key, in any order.
func (s *scanner) keys(line []byte, f *fields) bool {
	*f = fields{}
	s.b, s.pos, s.marks = line, 0, s.marks[:0]
	if !s.next('{') {
		return false
	}
	for {
		key, ok := s.text()
		if !ok || !s.next(':') || !s.field(f, key) {
			return false
		}
		if s.next(',') {
			continue
		}
		return s.next('}') && s.atEnd() && f.complete()
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
			s.mark(bit, s.pos-1-len(text), s.pos-1)
			f.at, ok = s.day.parse(text)
		}
	case "meter":
		bit = seenMeter
		f.meter, ok = s.text()
		s.mark(bit, s.pos-1-len(f.meter), s.pos-1)
	case "w", "j":
		bit = seenValue
		f.valueIsJoules = key[0] == 'j'
		s.space()
		start := s.pos
		f.value, ok = s.number()
		s.mark(bit, start, s.pos)
	case "wrap_j":
		bit = seenWrap
		f.wrap, ok = s.number()
	default:
		return s.skip()
	}
	if f.seen&bit != 0 {
		return false // twice: the general path says so
	}
	f.seen |= bit
	return ok
}

// skip passes over the value of a key that is ignored, if it is a plain one.
func (s *scanner) skip() bool {
	s.space()
	rest := s.b[s.pos:]
	n := bytes.IndexAny(rest, ",} \t\r\n")
	if n <= 0 || rest[0] == '"' {
		_, ok := s.text()
		return ok
	}
	s.pos += n
	return rest[0] != '{' && rest[0] != '[' && json.Valid(rest[:n])
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

func (s *scanner) atEnd() bool {
	s.space()
	return s.pos == len(s.b)
}

// text takes a string of printable ASCII without escapes.
func (s *scanner) text() ([]byte, bool) {
	if !s.next('"') {
		return nil, false
	}
	text, ok := plainText(s.b[s.pos:])
	s.pos += len(text) + 1
	return text, ok
}

func (s *scanner) number() (float64, bool) {
	s.space()
	v, n := plainNumber(s.b[s.pos:])
	s.pos += n
	return v, n > 0
}
