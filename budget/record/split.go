package record

import (
	"bytes"
	"encoding/json"
)

// member is one key of a JSON object and its value as it is written.
type member struct {
	key string
	raw []byte
}

// split gives the members of a JSON object. It is known to be valid, so that
// values need only be passed over.
func split(object []byte) (members []member) {
	rest := trim(object[1:])
	for rest[0] != '}' {
		key := rest[:valueEnd(rest)]
		rest = trim(rest[len(key):])
		rest = trim(rest[1:]) // the colon
		raw := rest[:valueEnd(rest)]
		rest = trim(rest[len(raw):])
		if rest[0] == ',' {
			rest = trim(rest[1:])
		}
		name, _ := unquote(key)
		members = append(members, member{name, raw})
	}
	return members
}

// valueEnd is the length of the value at the start of b, in a valid object.
func valueEnd(b []byte) int {
	depth := 0
	for i := 0; ; i++ {
		switch c := b[i]; {
		case c == '"':
			i += stringEnd(b[i:]) - 1
			if depth == 0 {
				return i + 1
			}
		case c == '{' || c == '[':
			depth++
		case depth == 0 && (c == '}' || c == ',' || isSpace(c)): // after a number or a word
			return i
		case c == '}' || c == ']':
			if depth--; depth == 0 {
				return i + 1
			}
		}
	}
}

// stringEnd is the length of the string at the start of b.
func stringEnd(b []byte) int {
	i := 1
	for ; b[i] != '"'; i++ {
		if b[i] == '\\' {
			i++
		}
	}
	return i + 1
}

// unquote reads a JSON string; ok is false for any other value.
func unquote(raw []byte) (s string, ok bool) {
	if raw[0] != '"' {
		return "", false
	}
	if bytes.IndexByte(raw, '\\') < 0 {
		return string(raw[1 : len(raw)-1]), true
	}
	return s, json.Unmarshal(raw, &s) == nil
}

// trim drops the white space of JSON, which is less than that of Unicode.
func trim(b []byte) []byte { return bytes.Trim(b, " \t\r\n") }
