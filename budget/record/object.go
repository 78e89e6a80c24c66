package record

import (
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
	members []member         // as they stand in the line, also several of one key
	wrong   *finding.Finding // What and Do only
}

// parseObject reads one line. Keys are taken exactly as written. What it gives
// is valid as long as line is.
func parseObject(line []byte) *object {
	o := &object{}
	switch {
	case !utf8.Valid(line):
		return o.fail("the line is not valid UTF-8", "write records in UTF-8")
	case !json.Valid(line):
		err := json.Unmarshal(line, new(json.RawMessage))
		return o.fail(fmt.Sprintf("the line is not valid JSON (%v)", err), "write one whole JSON object a line")
	}
	if line = trim(line); line[0] != '{' {
		return o.fail("the line is not a JSON object", "write one object a line, like {\"k\":\"power\",...}")
	}
	o.members = split(line)
	return o
}

// fail keeps the first problem of the line.
func (o *object) fail(what, do string) *object {
	if o.wrong == nil {
		o.wrong = &finding.Finding{What: what, Do: do}
	}
	return o
}

// raw is the value of the key, nil where it is absent or null. A key that
// counts and stands twice is wrong: which of the two counts would be a guess.
func (o *object) raw(key string) (raw []byte) {
	for _, m := range o.members {
		if m.key == key && raw != nil {
			o.fail(fmt.Sprintf("the key %s stands twice", quote(key)), "write each key once")
			return nil
		}
		if m.key == key {
			raw = m.raw
		}
	}
	if string(raw) == "null" {
		return nil
	}
	return raw
}

func (o *object) has(key string) bool { return o.raw(key) != nil }

// need complains where the key is missing.
func (o *object) need(key, do string) bool {
	if !o.has(key) {
		o.fail(fmt.Sprintf("%q is missing", key), do)
		return false
	}
	return true
}

func (o *object) text(key string) string {
	raw := o.raw(key)
	if raw == nil {
		return ""
	}
	s, ok := unquote(raw)
	if !ok {
		o.fail(fmt.Sprintf("%q is %s, not text", key, show(raw)), "write it in quotation marks")
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
	if raw := o.raw(key); raw != nil && isDigit(raw[0]) {
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
		o.fail(fmt.Sprintf("%q is %s, which is no time between 1678 and 2262", key, quote(text)), `write date, time and offset, like "2031-03-04T02:15:00Z"`)
	}
	return at
}

// number is a finite number that is not below zero.
func (o *object) number(key, what string) float64 {
	if !o.need(key, "write "+what) {
		return 0
	}
	raw := o.raw(key)
	v, err := strconv.ParseFloat(string(raw), 64)
	switch {
	case err != nil && math.IsInf(v, 0):
		o.fail(fmt.Sprintf("%q is %s, which is beyond any finite number", key, show(raw)), "write "+what)
	case err != nil:
		o.fail(fmt.Sprintf("%q is %s, not a number", key, show(raw)), "write "+what)
	case v < 0:
		o.fail(fmt.Sprintf("%q is %s, below zero", key, show(raw)), "write "+what+", at least 0, and drop readings that the meter marks as bad")
	}
	return math.Abs(v) // -0 is 0
}

// whole is a whole number from least up.
func (o *object) whole(key string, least int) int {
	raw := o.raw(key)
	n, err := wholeNumber(raw)
	if err != nil || n < least {
		o.fail(fmt.Sprintf("%q is %s", key, show(raw)), fmt.Sprintf("write a whole number from %d up", least))
	}
	return n
}

// wholeNumber reads 2, and 2.0 and 2e0 as some languages write it. Beyond 2^53
// neighbours would be taken for one another.
func wholeNumber(raw []byte) (int, error) {
	v, err := strconv.ParseFloat(string(raw), 64)
	if err != nil || v != math.Trunc(v) || math.Abs(v) >= 1<<53 {
		return 0, strconv.ErrRange
	}
	return int(v), nil
}

// texts is an object of texts, nil where it is absent or empty.
func (o *object) texts(key string) map[string]string {
	raw := o.raw(key)
	if raw == nil {
		return nil
	}
	inner := parseObject(raw)
	good := inner.wrong == nil
	texts := map[string]string{}
	for _, m := range inner.members {
		s, ok := unquote(m.raw)
		_, twice := texts[m.key]
		texts[m.key], good = s, good && ok && !twice
	}
	if !good {
		o.fail(fmt.Sprintf("%q is not an object of texts with each key once", key), `write it like {"team":"tide"}`)
	}
	if len(texts) == 0 {
		return nil
	}
	return texts
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
