package report

import (
	"fmt"
	"strings"
	"unicode"
	"unicode/utf8"
)

// longest is how much of one text from a record is shown. JSON has all of it.
const longest = 300

// Inert makes text that somebody else wrote harmless in a line of plain text:
// control, bidirectional and zero-width characters become visible escapes, and
// a text of any length becomes a short one.
func Inert(text string) string {
	var b strings.Builder
	n := 0
	for _, r := range text {
		if n++; n > longest {
			b.WriteString("...")
			break
		}
		if r == utf8.RuneError || !plain(r) {
			fmt.Fprintf(&b, `\u%04x`, r)
			continue
		}
		b.WriteRune(r)
	}
	return b.String()
}

// plain tells whether a rune prints as itself, takes room, and turns nothing
// round. Fillers that print as nothing are letters to Unicode.
func plain(r rune) bool {
	if strings.ContainsRune("\u115f\u1160\u3164\uffa0\u2800", r) {
		return false
	}
	return r == ' ' || unicode.IsGraphic(r) && !unicode.Is(unicode.Zs, r) && !unicode.Is(unicode.Mn, r)
}

// code makes text inert in Markdown: a code span, in which nothing is a link,
// a mention, an entity or a tag. Its fence is longer than any run of backticks
// in it. A pipe would end a table's cell even there and is escaped.
func code(text string) string {
	text = strings.ReplaceAll(Inert(text), "|", `\|`)
	if strings.TrimSpace(text) == "" {
		return ""
	}
	fence := strings.Repeat("`", longestRun(text, '`')+1)
	if fence != "`" || strings.HasPrefix(text, "`") || strings.HasSuffix(text, "`") || strings.Trim(text, " ") != text {
		return fence + " " + text + " " + fence
	}
	return fence + text + fence
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
