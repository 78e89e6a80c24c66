package ledger

import (
	"bytes"

	"budgetcheck/budget/unit"
)

// head is what the start of an entry's line tells, at a fraction of the cost of
// decoding it: most lines that are met are none of those that are asked for.
type head struct {
	repository, account, booked, corrects, run []byte
}

// scanHead reads the keys of a line up to "run", in the order in which they are
// written here. It is not sure of anything else: marks, escapes, other
// characters than ASCII, other orders. Such a line has to be decoded.
func scanHead(text []byte) (h head, sure bool) {
	rest, ok := bytes.CutPrefix(text, []byte(`{"k":"run"`))
	for ok {
		var key, value []byte
		if key, value, rest, ok = member(rest); !ok {
			break
		}
		switch string(key) {
		case "repository":
			h.repository = value
		case "account":
			h.account = value
		case "booked_at":
			h.booked = value
		case "corrects":
			h.corrects = value
		case "inputs", "facts", "thin", "why":
		case "run":
			h.run = value
			return h, h.booked != nil
		default:
			ok = false
		}
	}
	return head{}, false
}

// member cuts `,"key":"value"` off, both of plain characters.
func member(text []byte) (key, value, rest []byte, ok bool) {
	if rest, ok = bytes.CutPrefix(text, []byte(`,"`)); !ok {
		return nil, nil, nil, false
	}
	if key, rest, ok = quoted(rest); !ok {
		return nil, nil, nil, false
	}
	if rest, ok = bytes.CutPrefix(rest, []byte(`:"`)); !ok {
		return nil, nil, nil, false
	}
	value, rest, ok = quoted(rest)
	return key, value, rest, ok
}

// quoted cuts plain characters and the closing quote off.
func quoted(text []byte) (value, rest []byte, ok bool) {
	for n, c := range text {
		switch {
		case c == '"':
			return text[:n], text[n+1:], true
		case c < ' ' || c > '~' || c == '\\':
			return nil, nil, false
		}
	}
	return nil, nil, false
}

// bookedAt is when a line was booked, if it can be read.
func bookedAt(text []byte) (unit.Instant, bool) {
	if h, sure := scanHead(text); sure {
		at, err := unit.ParseInstant(string(h.booked))
		return at, err == nil
	}
	l, err := parse(text)
	return l.booked, err == nil
}

// written tells whether texts stand in a line as they are: without escapes.
func written(texts ...string) bool {
	for _, text := range texts {
		if _, _, ok := quoted(append([]byte(text), '"')); !ok || bytes.ContainsAny([]byte(text), `"<>&`) {
			return false
		}
	}
	return true
}
