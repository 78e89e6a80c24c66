package grid

import (
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
	f := &File{Name: name, steps: map[key][]step{}, broken: map[string]finding.Finding{}}
	rows := csv.NewReader(r)
	rows.ReuseRecord = true
	rows.FieldsPerRecord = -1 // counted here, with a message of our own
	header, err := rows.Read()
	if err != nil && !isRowError(err) && !errors.Is(err, io.EOF) {
		return nil, fmt.Errorf("%s: %w", name, err)
	}
	at, ok := f.header(header, columns)
	for ok {
		row, err := rows.Read()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil && !isRowError(err) {
			return nil, fmt.Errorf("%s: %w", name, err)
		}
		f.row(row, at, rows, err)
	}
	f.order()
	return f, nil
}

func isRowError(err error) bool {
	var row *csv.ParseError
	return errors.As(err, &row)
}

// columnAt are the positions of the columns, in the order of Columns.
type columnAt [5]int

func (f *File) header(header []string, c Columns) (at columnAt, ok bool) {
	if len(header) > 0 {
		header[0] = strings.TrimPrefix(header[0], "\ufeff")
	}
	own := [...]string{"zone", "from", "to", "g_per_kwh", "factor"}
	mapped := [...]string{c.Zone, c.From, c.To, c.GPerKWh, c.Factor}
	for n, name := range own {
		if mapped[n] != "" {
			name = mapped[n]
		}
		at[n] = slices.IndexFunc(header, func(h string) bool { return strings.TrimSpace(h) == name })
		if at[n] < 0 {
			f.refuse("", 1, fmt.Sprintf("the header has no column %q", name),
				"write the header zone,from,to,g_per_kwh,factor, or name your columns in [grid.columns] of the policy")
			return at, false
		}
	}
	return at, true
}

// row takes one row. A row without an intensity is a hole.
func (f *File) row(row []string, at columnAt, rows *csv.Reader, err error) {
	var bad *csv.ParseError
	if errors.As(err, &bad) {
		f.refuse("", bad.Line, fmt.Sprintf("the row cannot be read (%v)", bad.Err), "mend its quotation marks")
		return
	}
	line, _ := rows.FieldPos(0)
	if slices.Max(at[:]) >= len(row) {
		f.refuse("", line, fmt.Sprintf("the row has %d fields, too few for its columns", len(row)), "write as many fields as the header has")
		return
	}
	zone := strings.Clone(row[at[0]])
	if zone == "" || !utf8.ValidString(zone) {
		f.refuse("", line, "the zone is empty or not valid UTF-8", "name the grid zone")
		return
	}
	k := key{zone, Factor(row[at[4]])}
	if k.factor != Average && k.factor != Marginal {
		f.refuse(zone, line, fmt.Sprintf("the factor is %q", string(k.factor)), "write average or marginal")
		return
	}
	// The key must not hold on to the reader's buffer.
	k.factor = map[Factor]Factor{Average: Average, Marginal: Marginal}[k.factor]
	if row[at[3]] == "" {
		f.Blank++
		return
	}
	in, err := interval(row[at[1]], row[at[2]], row[at[3]])
	if err != nil {
		f.refuse(zone, line, err.Error(), "mend the row, or leave its intensity empty for a hole")
		return
	}
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
	if err != nil || math.IsInf(v, 0) || math.IsNaN(v) || v < 0 {
		return in, fmt.Errorf("the intensity %q is not a finite number of g/kWh from 0 up", g)
	}
	in.I = unit.Intensity(v)
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
