package report

import (
	"fmt"
	"io"
	"strings"
)

// Unjudged writes the Markdown of a change for which there is no statement, and
// why there is none: one line of why each.
func Unjudged(w io.Writer, why string) error {
	var b strings.Builder
	b.WriteString("**Gate unknown:** this change could not be judged.\n\n")
	for line := range strings.SplitSeq(strings.TrimSpace(why), "\n") {
		fmt.Fprintf(&b, "- %s\n", code(line))
	}
	fmt.Fprintf(&b, "\n%s\n", Caution)
	_, err := io.WriteString(w, b.String())
	return err
}
