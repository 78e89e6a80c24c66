package record

import "bytes"

// shape is how a line was written that the scanner took: the bytes between its
// values. A line with the same bytes there, and values that are each plain, is
// such a line too, so that one comparison stands for all that keys checks.
type shape struct {
	known  bool
	kind   Kind    // what the bytes between the values say
	wrap   float64 // likewise
	slots  [3]slot // in the order of the line; none before the first learn
	behind []byte  // what follows the last value
}

// slot is one value that differs from line to line.
type slot struct {
	before []byte // what stands between it and the value before
	what   uint8  // seenAt, seenMeter or seenValue
	length int    // of the value in the latest line
}

// mark is where in a line a value stands.
type mark struct {
	what       uint8
	start, end int
}

func (s *scanner) mark(what uint8, start, end int) {
	s.marks = append(s.marks, mark{what, start, end})
}

// learn takes the shape of a line that keys took.
func (sh *shape) learn(line []byte, marks []mark, f *fields) {
	sh.known, sh.kind, sh.wrap = true, f.kind, f.wrap
	pos := 0
	for i, m := range marks {
		sl := &sh.slots[i]
		sl.before = append(sl.before[:0], line[pos:m.start]...)
		sl.what, sl.length = m.what, m.end-m.start
		pos = m.end
	}
	sh.behind = append(sh.behind[:0], line[pos:]...)
}

// again reads a line that is written like the one that sh was learnt from.
func (s *scanner) again(sh *shape, line []byte, f *fields) (ok bool) {
	if !sh.known {
		return false
	}
	f.kind, f.wrap = sh.kind, sh.wrap
	for i := range sh.slots {
		sl := &sh.slots[i]
		if !bytes.HasPrefix(line, sl.before) {
			return false
		}
		line = line[len(sl.before):]
		n := 0
		switch sl.what {
		case seenAt:
			n = sl.end(line)
			f.at, ok = s.day.parse(line[:n])
		case seenMeter:
			f.meter, ok = plainText(line)
			n = len(f.meter)
			ok = ok && n > 0
		case seenValue:
			f.value, n = plainNumber(line)
			ok = n > 0
		}
		if !ok {
			return false
		}
		line = line[n:]
	}
	return bytes.Equal(line, sh.behind)
}

// end is where the text that line starts with ends: mostly where the last did.
func (sl *slot) end(line []byte) int {
	if sl.length >= len(line) || line[sl.length] != '"' {
		sl.length = max(bytes.IndexByte(line, '"'), 0)
	}
	return sl.length
}
