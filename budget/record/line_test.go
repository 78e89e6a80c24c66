package record

import (
	"fmt"
	"regexp"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// refusesLine puts line between two good ones, of which nothing may be lost.
func refusesLine(t *testing.T, line, want string) {
	t.Run(line, func(t *testing.T) {
		got := read(t, text(opening, power(1, "gpu0", 400), line, power(9, "gpu0", 401)))
		require.Len(t, got.findings, 1)
		assert.Equal(t, "tide.ndjson:3: "+want, plain(got.findings[0]))
		assert.Equal(t, []int{1, 2, 4}, got.numbers())
	})
}

// plain drops what the standard library says of broken JSON, in its own words.
func plain(message string) string {
	return regexp.MustCompile(`(not valid JSON) \([^;]+\)`).ReplaceAllString(message, "$1")
}

func TestMissingKeys(t *testing.T) {
	const words, when = "; write it as text that is not empty", `; write a time with offset, like "2031-03-04T02:15:00Z"`
	for _, c := range []struct{ line, key, do string }{
		{power(2, "gpu1", 1), "k", words}, {power(2, "gpu1", 1), "at", when}, {power(2, "gpu1", 1), "meter", words}, {power(2, "gpu1", 1), "w", "; write a power in W"},
		{energy(2, "cpu", 1), "at", when}, {energy(2, "cpu", 1), "meter", words}, {energy(2, "cpu", 1), "j", "; write a counter's reading in J"},
		{used(2, 3, 1), "from", when}, {used(2, 3, 1), "to", when}, {used(2, 3, 1), "kwh", "; write an energy in kWh"},
		{used(2, 3, 1), "how", "; write measured or estimated"},
		{work(2, "step", 1), "at", when}, {work(2, "step", 1), "unit", words}, {work(2, "step", 1), "done", "; write the work done so far"},
		{closing(2, "ok"), "at", when}, {closing(2, "ok"), "outcome", "; write one of [ok pilot stopped failed cancelled]"},
	} {
		want := fmt.Sprintf("%q is missing%s", c.key, c.do)
		refusesLine(t, strings.Replace(c.line, `"`+c.key+`":`, `"other":`, 1), want)
	}
	for key, do := range map[string]string{"format": `; write "format":1`, "run": words, "job": words, "at": when} {
		got := read(t, text(strings.Replace(opening, `"`+key+`":`, `"other":`, 1)))
		assert.Equal(t, []string{fmt.Sprintf("tide.ndjson:1: %q is missing%s", key, do)}, got.findings)
	}
}

func TestBadOpen(t *testing.T) {
	for member, want := range map[string]string{
		`"format":2`:                `"format" is 2; this version reads format 1, so write that or use a newer budgetcheck`,
		`"format":"1"`:              `"format" is "1"; this version reads format 1, so write that or use a newer budgetcheck`,
		`"run":7`:                   `"run" is 7, not text; write it in quotation marks`,
		`"job":null`:                `"job" is missing; write it as text that is not empty`,
		`"attempt":0`:               `"attempt" is 0; write a whole number from 1 up`,
		`"attempt":1.5`:             `"attempt" is 1.5; write a whole number from 1 up`,
		`"attempt":"1"`:             `"attempt" is "1"; write a whole number from 1 up`,
		`"attempt":1e99`:            `"attempt" is 1e99; write a whole number from 1 up`,
		`"parts":0`:                 `"parts" is 0; write a whole number from 1 up`,
		`"parts":2`:                 `"parts" is above 1 but "part" is missing; say which part this is`,
		`"part":1.5`:                `"part" is 1.5; write a whole number from 0 up`,
		`"part":-1`:                 `"part" is -1, not text; write it in quotation marks`,
		`"part":true`:               `"part" is true, not text; write it in quotation marks`,
		`"pull":0`:                  `"pull" is 0; write a whole number from 1 up`,
		`"pull":-1`:                 `"pull" is -1; write a whole number from 1 up`,
		`"reserved":0`:              `"reserved" is 0; write the number of units reserved, or leave it out for all`,
		`"reserved":-1`:             `"reserved" is -1, below zero; write the number of units of the machine, at least 0, and drop readings that the meter marks as bad`,
		`"labels":["a"]`:            `"labels" is not an object of texts with each key once; write it like {"team":"tide"}`,
		`"labels":{"a":1}`:          `"labels" is not an object of texts with each key once; write it like {"team":"tide"}`,
		`"labels":{"a":null}`:       `"labels" is not an object of texts with each key once; write it like {"team":"tide"}`,
		`"labels":{"a":"b","a":""}`: `"labels" is not an object of texts with each key once; write it like {"team":"tide"}`,
		`"site":["quay-north"]`:     `"site" is ["quay-north"], not text; write it in quotation marks`,
		`"at":1930360500`:           `"at" is 1930360500, not text; write it in quotation marks`,
	} {
		t.Run(member, func(t *testing.T) {
			key, _, _ := strings.Cut(member[1:], ":")
			line := strings.Replace(opening, `"`+key+":", `"old `+key+":", 1)
			got := read(t, text(strings.Replace(line, "}", ","+member+"}", 1)))
			require.Len(t, got.findings, 1)
			assert.Equal(t, "tide.ndjson:1: "+want, got.findings[0])
		})
	}
}

func TestBadWords(t *testing.T) {
	refusesLine(t, closing(2, "done"), `"outcome" is "done"; write one of [ok pilot stopped failed cancelled]`)
	refusesLine(t, closing(2, ""), `"outcome" is ""; write one of [ok pilot stopped failed cancelled]`)
	refusesLine(t, strings.Replace(used(2, 3, 1), "measured", "guessed", 1), `"how" is "guessed"; write one of [measured estimated]`)
	refusesLine(t, strings.Replace(work(2, "step", 1), "}", `,"of":"all"}`, 1), `"of" is "all"; write one of [run part]`)
	refusesLine(t, work(2, "", 1), `"unit" is empty; write it as text that is not empty`)
	refusesLine(t, power(2, "", 1), `"meter" is empty; write it as text that is not empty`)
	refusesLine(t, `{"k":"","at":1}`, `"k" is empty; write it as text that is not empty`)
	refusesLine(t, `{"k":7}`, `"k" is 7, not text; write it in quotation marks`)
}

func TestBadTimes(t *testing.T) {
	for _, written := range []string{"yesterday", "2031-03-04T02:15:02", "2031-03-04 02:15:02Z", "2031-03-04T2:15:02Z", "2031-03-04T02:15:02,5Z",
		"2031-02-29T00:00:00Z", "2031-03-04T02:15:02+24:00", "9999-01-01T00:00:00Z", "1677-09-21T00:12:43Z", ""} {
		want := fmt.Sprintf(`"at" is %q, which is no time between 1678 and 2262; write date, time and offset, like "2031-03-04T02:15:00Z"`, written)
		refusesLine(t, strings.Replace(power(2, "gpu0", 1), "2031-03-04T02:15:02Z", written, 1), want)
	}
}

func TestBadJSON(t *testing.T) {
	const object, whole = `the line is not a JSON object; write one object a line, like {"k":"power",...}`, "; write one whole JSON object a line"
	for line, want := range map[string]string{
		`[]`:                           object,
		`12`:                           object,
		`"text"`:                       object,
		`null`:                         object,
		`{"k":"power"}]`:               "the line is not valid JSON" + whole,
		`k=power w=400`:                "the line is not valid JSON" + whole,
		"\ufeff{}":                     "the line is not valid JSON" + whole, // a byte order mark belongs to the start of the file
		`{"k":"power"`:                 "the line is not valid JSON" + whole,
		`{"k":"power",}`:               "the line is not valid JSON" + whole,
		`{"k" "power"}`:                "the line is not valid JSON" + whole,
		`{"k":"power" "w":1}`:          "the line is not valid JSON" + whole,
		`{'k':'power'}`:                "the line is not valid JSON" + whole,
		`{1:2}`:                        "the line is not valid JSON" + whole,
		`{"k":"po\x"}`:                 "the line is not valid JSON" + whole,
		power(2, "g", 1) + "x":         "the line is not valid JSON" + whole,
		power(2, "g", 1) + "{}":        "the line is not valid JSON" + whole,
		power(2, "g", 1) + "\v":        "the line is not valid JSON" + whole,
		`{"k":"close","k":"ok"}`:       `the key "k" stands twice; write each key once`,
		`{"k":"x","\u006b":"y"}`:       `the key "k" stands twice; write each key once`,
		"{\"k\":\"power\",\"\xff\":1}": "the line is not valid UTF-8; write records in UTF-8",
		"{\"k\":\"caf\xe9\"}":          "the line is not valid UTF-8; write records in UTF-8",
	} {
		refusesLine(t, line, want)
	}
	for key, again := range map[string]string{"k": `"power"`, "at": at(2), "meter": `"gpu0"`, "w": "1"} {
		refusesLine(t, strings.Replace(power(2, "gpu0", 1), "}", `,"`+key+`":`+again+"}", 1), `the key "`+key+`" stands twice; write each key once`)
	}
}

// TestDeepNesting: no depth of nesting harms, where it counts and where not.
func TestDeepNesting(t *testing.T) {
	deep := strings.Repeat("[", MaxLine/2)
	for _, line := range []string{deep, `{"k":"power","w":` + deep, `{"a":` + strings.Repeat(`{"a":`, 100_000)} {
		got := read(t, text(opening, line, closing(1, "ok")))
		assert.Len(t, got.findings, 1)
		assert.Equal(t, []int{1, 3}, got.numbers())
	}
	nested := strings.Repeat("[", 5000) + strings.Repeat("]", 5000)
	got := read(t, text(opening, strings.Replace(power(2, "gpu0", 1), "}", `,"other":`+nested+"}", 1)))
	assert.Empty(t, got.findings, "unknown keys are ignored")
}

// TestMessagesAreShortAndInert: text of a record comes out escaped and cut.
func TestMessagesAreShortAndInert(t *testing.T) {
	long := strings.Repeat("é\u202e\x1b", 100)
	quoted := strings.ReplaceAll(long, "\x1b", `\u001b`)
	for _, line := range []string{`{"k":"` + quoted + `"}`, `{"` + quoted + `":1,"` + quoted + `":2}`, `{"k":"close","at":"` + quoted + `"}`,
		`{"k":"close","at":` + at(1) + `,"outcome":"` + quoted + `"}`, power(1, "m", `"`+quoted+`"`),
		`{"k":"power","at":` + at(0) + `,"meter":"` + quoted + `","w":1}` + "\n" + `{"k":"energy","at":` + at(1) + `,"meter":"` + quoted + `","j":1}`,
		`{"k":"power","at":` + at(0) + `,"meter":["` + quoted + `"],"w":1}`} {
		got := read(t, text(opening, line))
		messages := append(got.findings, got.unknown...)
		require.Len(t, messages, 1, line[:20])
		assert.Less(t, len(messages[0]), 700)
		assert.NotContains(t, messages[0], "\x1b")
		assert.NotContains(t, messages[0], "\u202e")
	}
}
