package report

import (
	"regexp"
	"strings"
)

// Cut shortens a statement's Markdown to room, for hosts that take no longer
// text. size measures a text the way the host does; it must add up over the
// lines. The text ends at the end of a row, with everything closed that is open
// there, and then with the pointer, which says where the whole is. What people
// must not take a statement without, its last line, stays. A text that fits is
// left as it is.
func Cut(markdown string, room int, size func(string) int, pointer string) string {
	if size(markdown) <= room {
		return markdown
	}
	body, end := parted(markdown)
	end = "\n" + pointer + "\n" + end
	room -= size(end)
	if room < 0 {
		return "" // not even the pointer fits
	}
	return within(strings.SplitAfter(body, "\n"), room, size) + end
}

// parted takes the last line off, where it is the one under every statement.
func parted(markdown string) (body, last string) {
	text := strings.TrimRight(markdown, "\n")
	at := strings.LastIndexByte(text, '\n') + 1
	if strings.HasSuffix(text, Caution) {
		return text[:at], "\n" + text[at:] + "\n"
	}
	return markdown, ""
}

// within is as much of the lines as fits, with what closes them.
func within(lines []string, room int, size func(string) int) string {
	var o outline
	best, used, closing := 0, 0, ""
	for i, line := range lines {
		if used += size(line); used > room {
			break
		}
		o.read(line)
		next := ""
		if i+1 < len(lines) {
			next = lines[i+1]
		}
		if c := o.closing(); o.mayEnd(next) && used+size(c) <= room {
			best, closing = i+1, c
		}
	}
	if best == 0 {
		return ""
	}
	return strings.TrimRight(strings.Join(lines[:best], ""), "\n") + "\n" + closing
}

// outline knows what is open at the end of a line. All HTML at the start of a
// line is our own: foreign text stands in code.
type outline struct {
	fence  string   // of the open code block
	tags   []string // open elements
	barren bool     // what was opened last has nothing in it yet
}

var (
	fenceLine = regexp.MustCompile("^(```+|~~~+)")
	tag       = regexp.MustCompile(`<(/?)([a-z]+)[^>]*>`)
	delimiter = regexp.MustCompile(`^\|[-:| ]+\|\s*$`) // between the head of a table and its rows
)

func (o *outline) read(line string) {
	mark := fenceLine.FindString(line)
	text := strings.TrimSpace(line)
	switch {
	case o.fence != "":
		if mark == text && mark != "" && mark[0] == o.fence[0] && len(mark) >= len(o.fence) {
			o.fence = ""
		}
		o.barren = false
	case mark != "":
		o.fence, o.barren = mark, true
	case strings.HasPrefix(line, "<"):
		o.elements(line)
	case strings.HasPrefix(line, "#"), delimiter.MatchString(line):
		o.barren = true
	case text != "":
		o.barren = false
	}
}

func (o *outline) elements(line string) {
	for _, t := range tag.FindAllStringSubmatch(line, -1) {
		switch n := len(o.tags); {
		case t[1] == "":
			o.tags = append(o.tags, t[2])
			o.barren = true
		case n > 0 && o.tags[n-1] == t[2]:
			o.tags = o.tags[:n-1]
			o.barren = t[2] == "summary" // the title of what follows
		}
	}
}

// mayEnd tells whether a text may end here: not between a title or the head of
// a table and what it is of.
func (o *outline) mayEnd(next string) bool {
	return !o.barren && (o.fence != "" || !delimiter.MatchString(next))
}

// closing closes what is open.
func (o *outline) closing() string {
	var b strings.Builder
	if o.fence != "" {
		b.WriteString(o.fence + "\n")
	}
	for i := len(o.tags) - 1; i >= 0; i-- {
		b.WriteString("\n</" + o.tags[i] + ">\n")
	}
	return b.String()
}
