package main

import (
	"fmt"
	"io"
	"os"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/record"
)

// progress shows how far a long step is, where somebody watches.
type progress struct {
	w    io.Writer // nil where nobody does
	what string
	n    int
}

// newProgress watches only on a terminal: a log keeps every line.
func newProgress(w io.Writer, what string) *progress {
	f, ok := w.(*os.File)
	if !ok {
		return &progress{}
	}
	if info, err := f.Stat(); err != nil || info.Mode()&os.ModeCharDevice == 0 {
		return &progress{}
	}
	return &progress{w: w, what: what}
}

// step counts one file.
func (p *progress) step(*record.Reader, *footprint.Part) {
	if p.n++; p.w != nil {
		fmt.Fprintf(p.w, "\r%s %d", p.what, p.n)
	}
}

// done ends the line.
func (p *progress) done() {
	if p.w != nil && p.n > 0 {
		fmt.Fprintln(p.w)
	}
}
