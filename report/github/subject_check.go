package github

import (
	"fmt"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// longestRef is far above what hosts and file systems allow for a branch.
const longestRef = 1000

// checker checks the values of an event, an input or an answer of the API, and
// keeps the first thing that is wrong.
type checker struct{ err error }

func (c *checker) fail(format string, args ...any) {
	if c.err == nil {
		c.err = fmt.Errorf(format, args...)
	}
}

// has says whether a value is there; a value that is needed and missing is wrong.
func (c *checker) has(key, text string) bool {
	if text == "" {
		c.fail("%s is missing", key)
	}
	return text != ""
}

// commit is the full id of a commit, in small letters.
func (c *checker) commit(key, text string) string {
	if !c.has(key, text) {
		return ""
	}
	if !isCommit(text) || isNone(text) {
		c.fail("%s is %s, not the full id of a commit (40 or 64 hexadecimal digits)", key, shown(text))
		return ""
	}
	return strings.ToLower(text)
}

// base is a commit that may be missing or, as hosts write it, all zeros.
func (c *checker) base(key, text string) string {
	if isNone(text) {
		return ""
	}
	return c.commit(key, text)
}

// branch is the short name of a branch or tag.
func (c *checker) branch(key, text string) string {
	if !c.has(key, text) {
		return ""
	}
	if wrong := wrongName(text); wrong != "" {
		c.fail("%s is %s, not the name of a branch or tag: %s", key, shown(text), wrong)
		return ""
	}
	return text
}

// ref is a full ref, as a branch or as a tag.
func (c *checker) ref(key, text string) (branch, tag string) {
	if !c.has(key, text) {
		return "", ""
	}
	if name, ok := strings.CutPrefix(text, "refs/heads/"); ok {
		return c.branch(key, name), ""
	}
	if name, ok := strings.CutPrefix(text, "refs/tags/"); ok {
		return "", c.branch(key, name)
	}
	c.fail("%s is %s, neither a branch (refs/heads/) nor a tag (refs/tags/)", key, shown(text))
	return "", ""
}

// number is the number of a pull request.
func (c *checker) number(key, text string) int {
	n, err := strconv.ParseUint(text, 10, 31)
	if err != nil || n == 0 {
		c.fail("%s is %s, not the number of a pull request (1 or more)", key, shown(text))
	}
	return int(n)
}

func isCommit(text string) bool {
	digits := strings.Trim(text, "0123456789abcdefABCDEF") == ""
	return digits && (len(text) == 40 || len(text) == 64)
}

// isNone says whether an id stands for no commit.
func isNone(text string) bool { return strings.Trim(text, "0") == "" }

// wrongName says why git would not take a name, or we would not: a name stands
// in addresses and messages later. Empty means it is fine.
func wrongName(name string) string {
	switch {
	case name == "":
		return "it is empty"
	case len(name) > longestRef:
		return fmt.Sprintf("it is longer than %d bytes", longestRef)
	case !utf8.ValidString(name):
		return "it is not UTF-8"
	case strings.ContainsFunc(name, unicode.IsControl):
		return "it has control characters"
	case strings.ContainsAny(name, " ~^:?*[\\") || strings.Contains(name, "..") || strings.Contains(name, "@{"):
		return "git does not allow its characters"
	}
	for part := range strings.SplitSeq(name, "/") {
		if part == "" || strings.HasPrefix(part, ".") || strings.HasPrefix(name, "-") || strings.HasSuffix(part, ".") || strings.HasSuffix(part, ".lock") {
			return "git does not allow a part of it"
		}
	}
	return ""
}

// shown is untrusted text for a message: quoted, escaped, and not too long.
func shown(text string) string {
	const most = 80
	if len(text) > most {
		return fmt.Sprintf("%+q (cut, %d bytes)", text[:most], len(text))
	}
	return strconv.QuoteToASCII(text)
}
