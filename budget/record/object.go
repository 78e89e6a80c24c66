package record

import (
	"bytes"
	"encoding/json"
	"fmt"
	"math"
	"strconv"
	"unicode/utf8"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/unit"
)

// object is a line read by the general path: any legal JSON object. It keeps
// the first thing that is wrong with it; getters after that return zero.
type object struct {
	fields map[string]json.RawMessage
	wrong  *finding.Finding // What and Do only
}

// parseObject reads one line. Keys are taken exactly as written, and a key
// that stands twice is wrong: which of the two counts would be a guess.
func parseObject(line []byte) *object {
	o := &object{fields: map[string]json.RawMessage{}}
	if !utf8.Valid(line) {
		return o.fail("the line is not valid UTF-8", "write records in UTF-8")
	}
	dec := json.NewDecoder(bytes.NewReader(line))
	if start, err := dec.Token(); err != nil || start != json.Delim('{') {
		return o.fail("the line is not a JSON object", "write one object a line, like {\"k\":\"power\",...}")
	}
	for dec.More() {
		if !o.member(dec) {
			return o
		}
	}
	if _, err := dec.Token(); err != nil {
		return o.broken(err)
	}
	if rest := bytes.TrimSpace(line[dec.InputOffset():]); len(rest) > 0 {
		return o.fail("something follows the JSON object", "write one object a line")
	}
	return o
}

func (o *object) member(dec *json.Decoder) bool {
	token, err := dec.Token()
	if err != nil {
		o.broken(err)
		return false
	}
	key := token.(string) // a member starts with a string, or Token fails
	var raw json.RawMessage
	if err := dec.Decode(&raw); err != nil {
		o.broken(err)
		return false
	}
	if _, twice := o.fields[key]; twice {
		o.fail(fmt.Sprintf("the key %s stands twice", quote(key)), "write each key once")
		return false
	}
	o.fields[key] = raw
	return true
}

func (o *object) broken(err error) *object {
	return o.fail(fmt.Sprintf("the line is not valid JSON (%v)", err), "write one whole JSON object a line")
}

// fail keeps the first problem of the line.
func (o *object) fail(what, do string) *object {
	if o.wrong == nil {
		o.wrong = &finding.Finding{What: what, Do: do}
	}
	return o
}

// has tells whether the key is there; "absent" and null are the same.
func (o *object) has(key string) bool {
	raw, ok := o.fields[key]
	return ok && string(raw) != "null"
}

// need complains where the key is missing.
func (o *object) need(key, do string) bool {
	if !o.has(key) {
		o.fail(fmt.Sprintf("%q is missing", key), do)
		return false
	}
	return true
}

func (o *object) text(key string) string {
	if !o.has(key) {
		return ""
	}
	var s string
	if json.Unmarshal(o.fields[key], &s) != nil {
		o.fail(fmt.Sprintf("%q is %s, not text", key, clip(o.fields[key])), "write it in quotation marks")
	}
	return s
}

// word is a text that must be there and not be empty.
func (o *object) word(key string) string {
	const do = "write it as text that is not empty"
	if !o.need(key, do) {
		return ""
	}
	s := o.text(key)
	if s == "" {
		o.fail(fmt.Sprintf("%q is empty", key), do)
	}
	return s
}

// label is a number or a text, told as text.
func (o *object) label(key string) string {
	if o.has(key) && isDigit(o.fields[key][0]) {
		return strconv.Itoa(o.whole(key, 0))
	}
	return o.text(key)
}

func (o *object) instant(key string) unit.Instant {
	if !o.need(key, `write a time with offset, like "2031-03-04T02:15:00Z"`) {
		return 0
	}
	text := o.text(key)
	at, err := unit.ParseInstant(text)
	if err != nil {
		o.fail(fmt.Sprintf("%q: %v", key, err), "")
	}
	return at
}

// number is a finite number that is not below zero.
func (o *object) number(key, what string) float64 {
	if !o.need(key, "write "+what) {
		return 0
	}
	raw := o.fields[key]
	v, err := strconv.ParseFloat(string(raw), 64)
	switch {
	case err != nil && math.IsInf(v, 0):
		o.fail(fmt.Sprintf("%q is %s, which is beyond any finite number", key, clip(raw)), "write "+what)
	case err != nil || !startsNumber(raw[0]):
		o.fail(fmt.Sprintf("%q is %s, not a number", key, clip(raw)), "write "+what)
	case v < 0:
		o.fail(fmt.Sprintf("%q is %s, below zero", key, clip(raw)), "write "+what+", at least 0; drop readings that the meter marks as bad")
	}
	return math.Abs(v) // -0 is 0
}

func startsNumber(c byte) bool { return c == '-' || isDigit(c) }

// whole is a whole number from least up.
func (o *object) whole(key string, least int) int {
	n, err := strconv.Atoi(string(o.fields[key]))
	if err != nil || n < least {
		o.fail(fmt.Sprintf("%q is %s", key, clip(o.fields[key])), fmt.Sprintf("write a whole number from %d up", least))
	}
	return n
}

// choice is one of the words, or the first where the key is absent.
func choice[T ~string](o *object, key string, words ...T) T {
	if !o.has(key) {
		return words[0]
	}
	got := T(o.text(key))
	for _, w := range words {
		if got == w {
			return got
		}
	}
	o.fail(fmt.Sprintf("%q is %s", key, quote(string(got))), fmt.Sprintf("write one of %v", words))
	return got
}

// quote shows text from a record in a message: escaped, and cut when long.
func quote(s string) string { return strconv.QuoteToASCII(string(clip([]byte(s)))) }

func clip(raw []byte) []byte {
	const most = 60
	if len(raw) > most {
		return append(bytes.ToValidUTF8(bytes.Clone(raw[:most]), nil), "..."...)
	}
	return raw
}
