package record

import (
	"bufio"
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"

	"budgetcheck/budget/finding"
)

// Reader reads one record line by line. Next returns the lines that hold
// together; what does not is in Findings, and what was settled without loss
// of truth (a torn last line, repeated samples) in Notes.
type Reader struct {
	name     string
	in       *bufio.Reader
	inflated io.Closer // nil for a plain record
	no       int       // number of the line being read
	scan     scanner
	fields   fields // of the line being read, by the fast path
	order    order
	line     Line

	fill func(*Open) // nil: nothing is filled in

	findings finding.List
	unknown  finding.List
	torn     int // number of a torn last line, 0 if none
	cutShort bool
}

// NewReader reads the record that r gives, plain, gzip or zstd, told by its
// first bytes. name is how messages call the file. A compressed stream with a
// broken header is an error.
func NewReader(r io.Reader, name string) (*Reader, error) {
	plain, closer, err := inflate(r)
	if err != nil {
		return nil, unreadable(name, err)
	}
	// One byte more than the longest line, for its newline.
	rd := &Reader{name: name, in: bufio.NewReaderSize(plain, MaxLine+1), inflated: closer}
	rd.order.meters.byName = map[string]int{}
	return rd, nil
}

// Fill has the open line completed before it is checked, by what the record's
// surroundings tell: absent attempt and parts are 0 in it.
func (r *Reader) Fill(with func(*Open)) { r.fill = with }

// Close releases what decompression holds. It does not close the input, and it
// never fails: what is wrong with the stream, Next has said.
func (r *Reader) Close() error {
	if r.inflated != nil {
		_ = r.inflated.Close()
	}
	return nil
}

// Meters are the names of the meters met so far, by the index in Line.Meter.
func (r *Reader) Meters() []string { return r.order.meters.names }

// Name is what messages call the record.
func (r *Reader) Name() string { return r.name }

// Findings are the lines that could not count, and why.
func (r *Reader) Findings() *finding.List { return &r.findings }

// Unknown are the lines of a kind that this version does not know. They are
// passed over; only vet reports them.
func (r *Reader) Unknown() *finding.List { return &r.unknown }

// Notes say what was settled without loss.
func (r *Reader) Notes() []string {
	var notes []string
	if r.torn > 0 {
		notes = append(notes, fmt.Sprintf("%s:%d: the last line is torn and was dropped", r.name, r.torn))
	}
	if r.cutShort {
		notes = append(notes, fmt.Sprintf("%s: the compressed stream is cut short; what it holds was read", r.name))
	}
	if n := r.order.repeats; n > 0 {
		notes = append(notes, fmt.Sprintf("%s: %d repeated samples counted once", r.name, n))
	}
	return notes
}

// Next returns the next line that holds together, or io.EOF. The line is
// valid until the next call. Any other error is a failure to read.
func (r *Reader) Next() (*Line, error) {
	for {
		raw, whole, err := r.next()
		if err != nil {
			return nil, r.end(err)
		}
		if r.read(raw, whole) {
			return &r.line, nil
		}
	}
}

// next cuts the next line out of the input; whole is false for a last line
// without its newline.
func (r *Reader) next() (raw []byte, whole bool, err error) {
	raw, err = r.in.ReadSlice('\n')
	r.no++
	switch {
	case err == nil:
		return raw[:len(raw)-1], true, nil
	case errors.Is(err, bufio.ErrBufferFull):
		return r.oversized()
	case len(raw) == 0:
		return nil, false, err
	case errors.Is(err, io.EOF):
		return raw, false, nil
	case errors.Is(err, io.ErrUnexpectedEOF): // a killed job's compressed record
		r.cutShort = true
		return raw, false, nil
	}
	return nil, false, err
}

// oversized passes over the rest of a line that is too long.
func (r *Reader) oversized() ([]byte, bool, error) {
	r.report(&finding.Finding{
		What: fmt.Sprintf("the line is longer than %d bytes", MaxLine),
		Do:   "write one JSON object a line, each ended by a newline",
	})
	for {
		_, err := r.in.ReadSlice('\n')
		if !errors.Is(err, bufio.ErrBufferFull) {
			return nil, true, ignoreEOF(err)
		}
	}
}

func ignoreEOF(err error) error {
	if errors.Is(err, io.EOF) || errors.Is(err, io.ErrUnexpectedEOF) {
		return nil // the next read meets the end again
	}
	return err
}

// end turns the end of the input into io.EOF, after the checks due there.
func (r *Reader) end(err error) error {
	if errors.Is(err, io.ErrUnexpectedEOF) {
		r.cutShort = true
		err = io.EOF
	}
	switch {
	case !errors.Is(err, io.EOF) && r.inflated != nil:
		return unreadable(r.name, err)
	case !errors.Is(err, io.EOF):
		return fmt.Errorf("%s: %w", r.name, err)
	case r.order.open == nil && r.findings.Len() == 0:
		r.no = 1
		r.report(&finding.Finding{What: "the record has no open line", Do: "a job that ran writes one first"})
	}
	return io.EOF
}

// read takes one raw line into r.line and tells whether it counts.
func (r *Reader) read(raw []byte, whole bool) bool {
	if r.no == 1 {
		raw = bytes.TrimPrefix(raw, []byte("\xef\xbb\xbf")) // a byte order mark says nothing
	}
	if r.scan.scan(raw, &r.fields) {
		return r.sample(&r.fields)
	}
	if len(bytes.TrimSpace(raw)) == 0 {
		return false
	}
	if !whole && !json.Valid(raw) {
		r.torn = r.no
		return false
	}
	line, meter, word, wrong := decode(raw, r.fill)
	if wrong != nil {
		r.order.refused = r.order.refused || line.Kind == KindOpen
		return r.refuse(wrong)
	}
	if line.Kind == KindUnknown {
		r.unknown.Add(finding.Finding{File: r.name, Line: r.no, What: "unknown kind of line " + quote(word),
			Do: "write one of [open power energy used work close]"})
		return false
	}
	r.line = line
	r.line.No = r.no
	if line.Kind == KindPower || line.Kind == KindEnergy {
		return r.settle(r.order.sample(&r.line, []byte(meter)))
	}
	return r.settle(r.order.rare(&r.line))
}

// sample takes a line of the fast path.
func (r *Reader) sample(f *fields) bool {
	r.line = Line{No: r.no, Kind: f.kind, At: f.at}
	r.line.setReading(f.value, f.wrap)
	return r.settle(r.order.sample(&r.line, f.meter))
}

// settle reports what the order of lines found wrong with r.line.
func (r *Reader) settle(wrong *finding.Finding, counts bool) bool {
	if wrong != nil {
		return r.refuse(wrong)
	}
	return counts
}

func (r *Reader) refuse(wrong *finding.Finding) bool {
	r.report(wrong)
	return false
}

func (r *Reader) report(f *finding.Finding) {
	f.File, f.Line = r.name, r.no
	r.findings.Add(*f)
}
