package ledger

import (
	"encoding/json"
	"errors"
	"fmt"

	"budgetcheck/budget/unit"
)

// line is one line of a ledger that is kept as text: an entry or a mark.
type line struct {
	entry *Entry // nil for a mark
	mark  *Mark  // nil for an entry
	// booked never goes back from one line of a file to the next, so that a
	// reader can seek. A mark's is never before its time.
	booked unit.Instant
	more   int // how many lines of the same booking follow
}

// entryLine and markLine are lines as they are written. Entry keeps its time of
// booking itself.
type entryLine struct {
	*Entry
	More int `json:"more,omitempty"`
}

type markLine struct {
	*Mark
	Booked unit.Instant `json:"booked_at"`
	More   int          `json:"more,omitempty"`
}

// append writes the line with its newline.
func (l line) append(text []byte) []byte {
	var v any = entryLine{l.entry, l.more}
	if l.mark != nil {
		v = markLine{l.mark, l.booked, l.more}
	}
	one, err := json.Marshal(v)
	if err != nil { // newDraft has tried
		panic(err)
	}
	return append(append(text, one...), '\n')
}

// errKind is of a line whose kind this version does not know.
var errKind = errors.New("is of a kind that this version does not know")

// parse reads a line, without its newline.
func parse(text []byte) (line, error) {
	e := entryLine{Entry: &Entry{}}
	if err := json.Unmarshal(text, &e); err != nil {
		return line{}, fmt.Errorf("cannot be read: %w", err)
	}
	switch e.Kind {
	case KindRun:
		return line{entry: e.Entry, booked: e.BookedAt, more: e.More}, e.check()
	case KindRelease:
		m := markLine{Mark: &Mark{}}
		err := json.Unmarshal(text, &m)
		return line{mark: m.Mark, booked: m.Booked, more: m.More}, err
	case "":
		return line{}, errors.New("has no k, which names its kind")
	}
	return line{booked: e.BookedAt, more: e.More}, fmt.Errorf("%q %w", clip(e.Kind), errKind)
}

// clip keeps a quotation of foreign text short.
func clip(text string) string {
	const most = 40
	if r := []rune(text); len(r) > most {
		return string(r[:most]) + "..."
	}
	return text
}

// check tells what keeps an entry from being used: everything that reads the
// books takes it for granted.
func (e *Entry) check() error {
	switch {
	case e.Run.Run == "":
		return errors.New("has no run")
	case len(e.Parts) != 1:
		return fmt.Errorf("is of run %s and has %d parts; an entry is of one", clip(e.Run.Run), len(e.Parts))
	case e.End < e.Start:
		return fmt.Errorf("is of run %s, which ends at %s, before it starts", clip(e.Run.Run), e.End)
	}
	for _, h := range e.Hours {
		if h.KWh < 0 || h.G != nil && *h.G < 0 {
			return fmt.Errorf("is of run %s, whose hour from %s is below zero", clip(e.Run.Run), h.From)
		}
	}
	return nil
}
