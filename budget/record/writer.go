package record

import (
	"encoding/json"
	"fmt"
	"io"

	"budgetcheck/budget/unit"
)

// Writer writes a record as a job goes. Each line is one Write call on the
// output, so that a killed job leaves whole lines and at most one torn one.
type Writer struct {
	out io.Writer
	buf []byte
}

// NewWriter writes to w, which should be opened for appending and not be
// buffered.
func NewWriter(w io.Writer) *Writer { return &Writer{out: w} }

// Open writes the first line.
func (w *Writer) Open(o Open) error {
	return w.object(struct {
		K      string `json:"k"`
		Format int    `json:"format"`
		Open
	}{"open", 1, o})
}

// Power writes one reading.
func (w *Writer) Power(at unit.Instant, meter string, p unit.Power) error {
	return w.sample("power", at, meter, "w", float64(p), 0)
}

// Energy writes a counter's reading. wrap goes on the meter's first line where
// the counter wraps; 0 leaves it out.
func (w *Writer) Energy(at unit.Instant, meter string, j, wrap unit.Joules) error {
	return w.sample("energy", at, meter, "j", float64(j), float64(wrap))
}

// Used writes a total over a span.
func (w *Writer) Used(u Used) error {
	how := "estimated"
	if u.Measured {
		how = "measured"
	}
	return w.object(struct {
		K    string       `json:"k"`
		From unit.Instant `json:"from"`
		To   unit.Instant `json:"to"`
		KWh  unit.Energy  `json:"kwh"`
		How  string       `json:"how"`
	}{"used", u.From, u.To, u.Energy, how})
}

// Work writes progress.
func (w *Writer) Work(at unit.Instant, p Work) error {
	of := ""
	if p.OfPart {
		of = "part"
	}
	return w.object(struct {
		K  string       `json:"k"`
		At unit.Instant `json:"at"`
		Work
		Of string `json:"of,omitempty"`
	}{"work", at, p, of})
}

// Close writes the last line.
func (w *Writer) Close(at unit.Instant, outcome Outcome) error {
	return w.object(struct {
		K       string       `json:"k"`
		At      unit.Instant `json:"at"`
		Outcome Outcome      `json:"outcome"`
	}{"close", at, outcome})
}

func (w *Writer) sample(kind string, at unit.Instant, meter, key string, value, wrap float64) error {
	name, err := json.Marshal(meter)
	if err != nil {
		return err
	}
	number, err := json.Marshal(value) // refuses what is not finite
	if err != nil {
		return fmt.Errorf("meter %s: %w", name, err)
	}
	w.buf = fmt.Appendf(w.buf[:0], `{"k":%q,"at":%q,"meter":%s,%q:%s`, kind, at.String(), name, key, number)
	if wrap != 0 {
		limit, err := json.Marshal(wrap)
		if err != nil {
			return fmt.Errorf("meter %s: wrap_j: %w", name, err)
		}
		w.buf = fmt.Appendf(w.buf, `,"wrap_j":%s`, limit)
	}
	return w.flush()
}

func (w *Writer) object(v any) error {
	text, err := json.Marshal(v)
	if err != nil {
		return err
	}
	w.buf = append(w.buf[:0], text[:len(text)-1]...)
	return w.flush()
}

// flush ends the object in buf and writes it as one line.
func (w *Writer) flush() error {
	w.buf = append(w.buf, '}', '\n')
	_, err := w.out.Write(w.buf)
	return err
}
