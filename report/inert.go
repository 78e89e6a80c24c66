package report

import (
	"fmt"
	"strings"
	"unicode"
	"unicode/utf8"
)

// longest is how many characters of one text from a record are shown. JSON has
// all of it.
const longest = 1000

// longestFence is how many backticks stand in a row. Common readers of Markdown
// give up on a code span whose fence has more than 80.
const longestFence = 20

// Inert makes text that somebody else wrote harmless in a line of plain text:
// control, bidirectional and zero-width characters become visible escapes, a
// text of any length becomes a short one, and nothing in it reads as a command
// to the CI system whose log the line ends up in.
func Inert(text string) string {
	var b strings.Builder
	var last rune
	n, row := 0, 0 // characters, and how many of them the last are alike
	for at, r := range text {
		if n++; n > longest {
			b.WriteString("...")
			break
		}
		if r != last {
			row = 0
		}
		if r == utf8.RuneError || !plain(r) || acts(text, at, row) {
			b.WriteString(visible(r))
			last = 0
			continue
		}
		b.WriteRune(r)
		last = r
		row++
	}
	return b.String()
}

// acts tells whether the character at this place, after so many of its like,
// would do something: make the line a command to a CI system that reads its own
// log, "::" at the start or "##" anywhere (common practice, from memory), or
// make a fence too long for a code span.
func acts(text string, at, row int) bool {
	switch text[at] {
	case '#':
		return row == 1
	case '`':
		return row == longestFence
	case ':':
		return strings.HasPrefix(text[at:], "::") && strings.TrimLeft(text[:at], " ") == ""
	}
	return false
}

// visible is the escape that stands in for a character.
func visible(r rune) string {
	if r > 0xffff {
		return fmt.Sprintf(`\U%08x`, r)
	}
	return fmt.Sprintf(`\u%04x`, r)
}

// plain tells whether a rune prints as itself, takes room, and turns nothing
// round. Fillers that print as nothing are letters to Unicode, and marks that
// lie over the letter before them take no room.
func plain(r rune) bool {
	if strings.ContainsRune("\u115f\u1160\u3164\uffa0\u2800", r) {
		return false
	}
	return r == ' ' || unicode.IsGraphic(r) && !unicode.In(r, unicode.Zs, unicode.Mn, unicode.Me)
}

// code makes text inert in Markdown: a code span, in which nothing is a link,
// a mention, an entity or a tag. Its fence is longer than any run of backticks
// in it. Markdown takes one space off both ends of a span that has other text
// between, so one is put on where the text's own would go.
func code(text string) string {
	text = Inert(text)
	if text == "" {
		return ""
	}
	fence := strings.Repeat("`", longestRun(text, '`')+1)
	ends := text[:1] + text[len(text)-1:]
	if strings.Trim(text, " ") != "" && strings.ContainsAny(ends, "` ") {
		text = " " + text + " "
	}
	return fence + text + fence
}

// cellCode is code within a table's cell. There a pipe would end the cell even
// in a code span and takes a backslash, and one that has a backslash already
// cannot be told from an escaped one and is made visible.
func cellCode(text string) string {
	return strings.NewReplacer(`\|`, `\`+visible('|'), "|", `\|`).Replace(code(text))
}

// longestRun is the length of the longest run of c in text.
func longestRun(text string, c byte) (longest int) {
	run := 0
	for i := range len(text) {
		if text[i] != c {
			run = 0
			continue
		}
		run++
		longest = max(longest, run)
	}
	return longest
}
