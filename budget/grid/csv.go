package grid

import (
	"bufio"
	"cmp"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"
	"strings"
	"unicode/utf8"

	"budgetcheck/budget/finding"
	"budgetcheck/budget/unit"
)

// Columns maps the column names of the contract to those of a file. An empty
// name stands for itself.
type Columns struct {
	Zone, From, To, GPerKWh, Factor string
}

// File is what one series file holds.
type File struct {
	Name     string
	Findings finding.List
	Blank    int // rows whose intensity is empty: holes

	steps  map[key][]step
	zones  map[string]bool            // that some row names, holes and bad rows included
	broken map[string]finding.Finding // by zone; "" stands for every zone of the file
}

// key names a series within one boundary.
type key struct {
	zone   string
	factor Factor
}

// step is an interval and the line it stands on.
type step struct {
	Interval
	line int
}

// ReadCSV reads a series file with the header zone,from,to,g_per_kwh,factor,
// in any order and beside other columns. Rows that cannot count are findings,
// and their zone is broken; an error is a failure to read.
func ReadCSV(r io.Reader, name string, columns Columns) (*File, error) {
	f := &File{Name: name, steps: map[key][]step{}, zones: map[string]bool{}, broken: map[string]finding.Finding{}}
	rows := csv.NewReader(withoutMark(r))
	rows.ReuseRecord = true
	rows.FieldsPerRecord = -1 // counted here, with a message of our own
	header, err := rows.Read()
	if err != nil && !isRowError(err) && !errors.Is(err, io.EOF) {
		return nil, fmt.Errorf("%s: %w", name, err)
	}
	lay, ok := f.header(header, columns)
	for ok {
		row, err := rows.Read()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil && !isRowError(err) {
			return nil, fmt.Errorf("%s: %w", name, err)
		}
		f.row(row, lay, rows, err)
	}
	f.order()
	return f, nil
}

func isRowError(err error) bool {
	var row *csv.ParseError
	return errors.As(err, &row)
}

// withoutMark drops a byte order mark, before the first quotation mark meets it.
func withoutMark(r io.Reader) io.Reader {
	const mark = "\ufeff"
	in := bufio.NewReader(r)
	if start, _ := in.Peek(len(mark)); string(start) == mark {
		in.Discard(len(mark)) // cannot fail: they were just seen
	}
	return in
}

// layout is how the rows of a file are laid out.
type layout struct {
	at     [5]int // positions of the columns, in the order of Columns
	fields int    // in every row
}

func (f *File) header(header []string, c Columns) (lay layout, ok bool) {
	own := [...]string{"zone", "from", "to", "g_per_kwh", "factor"}
	mapped := [...]string{c.Zone, c.From, c.To, c.GPerKWh, c.Factor}
	lay.fields = len(header)
	for n, name := range own {
		if mapped[n] != "" {
			name = mapped[n]
		}
		same := func(h string) bool { return strings.TrimSpace(h) == name }
		if lay.at[n] = slices.IndexFunc(header, same); lay.at[n] < 0 {
			f.refuse("", 1, fmt.Sprintf("the header has no column %q", name),
				"write the header zone,from,to,g_per_kwh,factor, or name your columns in [grid.columns] of the policy")
			return lay, false
		}
		if slices.ContainsFunc(header[lay.at[n]+1:], same) {
			f.refuse("", 1, fmt.Sprintf("the header has two columns %q", name), "name the other one differently")
			return lay, false
		}
	}
	return lay, true
}

// row takes one row. A row without an intensity is a hole.
func (f *File) row(row []string, lay layout, rows *csv.Reader, err error) {
	var bad *csv.ParseError
	if errors.As(err, &bad) {
		f.refuse("", bad.StartLine, fmt.Sprintf("the row cannot be read (%v)", bad.Err), "mend its quotation marks")
		return
	}
	line, _ := rows.FieldPos(0)
	if len(row) != lay.fields {
		f.refuse("", line, fmt.Sprintf("the row has %d fields, the header %d", len(row), lay.fields),
			"write as many fields as the header has, and decimals with a point")
		return
	}
	cell := func(n int) string { return strings.TrimSpace(row[lay.at[n]]) }
	zone := cell(0)
	if zone == "" || !utf8.ValidString(zone) {
		f.refuse("", line, "the zone is empty or not valid UTF-8", "name the grid zone")
		return
	}
	f.zones[zone] = true
	factor := Factor(cell(4))
	if factor != Average && factor != Marginal {
		f.refuse(zone, line, fmt.Sprintf("the factor is %q", string(factor)), "write average or marginal")
		return
	}
	if cell(3) == "" {
		f.Blank++
		return
	}
	in, err := interval(cell(1), cell(2), cell(3))
	if err != nil {
		f.refuse(zone, line, err.Error(), "mend the row, or leave its intensity empty for a hole")
		return
	}
	k := key{zone, factor}
	f.steps[k] = append(f.steps[k], step{in, line})
}

func interval(from, to, g string) (in Interval, err error) {
	if in.From, err = unit.ParseInstant(from); err != nil {
		return in, err
	}
	if in.To, err = unit.ParseInstant(to); err != nil {
		return in, err
	}
	if in.To <= in.From {
		return in, fmt.Errorf("the interval ends at %s, not after its start %s", in.To, in.From)
	}
	v, err := strconv.ParseFloat(g, 64)
	hex := strings.ContainsAny(g, "xX")
	if err != nil || hex || math.IsInf(v, 0) || math.IsNaN(v) || v < 0 {
		return in, fmt.Errorf("the intensity %q is not a finite decimal number of g/kWh from 0 up", g)
	}
	in.I = unit.Intensity(math.Abs(v)) // -0 is 0
	return in, nil
}

func (f *File) refuse(zone string, line int, what, do string) {
	found := finding.Finding{File: f.Name, Line: line, What: what, Do: do}
	f.Findings.Add(found)
	if _, known := f.broken[zone]; !known {
		f.broken[zone] = found
	}
}

// order sorts the rows of each series and refuses those that overlap an
// earlier one; which of the two holds would be a guess.
func (f *File) order() {
	for _, k := range sortedKeys(f.steps) {
		steps := f.steps[k]
		slices.SortStableFunc(steps, func(a, b step) int { return cmp.Compare(a.From, b.From) })
		kept := steps[:0]
		for _, s := range steps {
			if n := len(kept); n > 0 && s.From < kept[n-1].To {
				f.refuse(k.zone, max(s.line, kept[n-1].line), fmt.Sprintf("the interval from %s overlaps that of line %d",
					s.From, min(s.line, kept[n-1].line)), "write each hour of a zone once in a file")
				continue
			}
			kept = append(kept, s)
		}
		f.steps[k] = kept
	}
}
