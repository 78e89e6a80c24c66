package footprint_test

import (
	"bytes"
	"io"
	"time"

	"github.com/stretchr/testify/require"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// start is when the records of the tests open: a full hour.
var start = unit.At(time.Date(2031, 3, 4, 2, 0, 0, 0, time.UTC))

// hour is the number of seconds in one; the tests tell times in seconds from
// start.
const hour = 3600.0

func after(seconds float64) unit.Instant {
	return start.Add(unit.Duration(seconds * float64(unit.Second)))
}

// method is how the tests weigh where they do not say otherwise.
var method = footprint.Method{Factor: grid.Average, Boundary: grid.Direct, MaxGap: 2 * unit.Minute, MinCoverage: 0.95}

// test is a test, a benchmark, or a drawn case of a property.
type test interface {
	require.TestingT
	Helper()
}

// sheet builds a record as a job would write it.
type sheet struct {
	t    test
	text bytes.Buffer
	w    *record.Writer
}

// open starts a record. Its open line is that of a run of one part which holds
// the whole machine; edits change it.
func open(t test, edits ...func(*record.Open)) *sheet {
	s := &sheet{t: t}
	s.w = record.NewWriter(&s.text)
	o := record.Open{Run: "r1", Attempt: 1, Job: "retrain-tide", Stage: "training", At: start, Site: "quay-north", Machine: "quad"}
	for _, edit := range edits {
		edit(&o)
	}
	require.NoError(t, s.w.Open(o))
	return s
}

// part makes the record part n of several.
func part(n string, of int) func(*record.Open) {
	return func(o *record.Open) { o.Part, o.Parts = n, of }
}

func reserved(units float64) func(*record.Open) {
	return func(o *record.Open) { o.Reserved = units }
}

func opensAt(seconds float64) func(*record.Open) {
	return func(o *record.Open) { o.At = after(seconds) }
}

func (s *sheet) power(at float64, meter string, w float64) *sheet {
	require.NoError(s.t, s.w.Power(after(at), meter, unit.Power(w)))
	return s
}

// powers writes one reading each `every` seconds from one moment to another,
// both included.
func (s *sheet) powers(from, to, every float64, meter string, w float64) *sheet {
	for at := from; at <= to; at += every {
		s.power(at, meter, w)
	}
	return s
}

func (s *sheet) energy(at float64, meter string, j, wrap float64) *sheet {
	require.NoError(s.t, s.w.Energy(after(at), meter, unit.Joules(j), unit.Joules(wrap)))
	return s
}

func (s *sheet) used(from, to, kwh float64, measured bool) *sheet {
	require.NoError(s.t, s.w.Used(record.Used{From: after(from), To: after(to), Energy: unit.Energy(kwh), Measured: measured}))
	return s
}

func (s *sheet) work(at float64, w record.Work) *sheet {
	require.NoError(s.t, s.w.Work(after(at), w))
	return s
}

func (s *sheet) close(at float64) *sheet { return s.closes(at, record.OK) }

func (s *sheet) closes(at float64, o record.Outcome) *sheet {
	require.NoError(s.t, s.w.Close(after(at), o))
	return s
}

// weigh weighs what was written so far.
func (s *sheet) weigh(f footprint.Facts, m footprint.Method) *footprint.Part {
	return weighText(s.t, s.text.Bytes(), f, m)
}

// run is the run of this one part.
func (s *sheet) run(f footprint.Facts, m footprint.Method) *footprint.Run {
	return footprint.Combine([]*footprint.Part{s.weigh(f, m)}, m)
}

func weighText(t test, text []byte, f footprint.Facts, m footprint.Method) *footprint.Part {
	return weighFrom(t, bytes.NewReader(text), f, m)
}

func weighFrom(t test, in io.Reader, f footprint.Facts, m footprint.Method) *footprint.Part {
	r, err := record.NewReader(in, "run.ndjson")
	require.NoError(t, err)
	p, err := footprint.Weigh(r, m, func(*record.Open) footprint.Facts { return f })
	require.NoError(t, err)
	return p
}

// plain are facts without any factor: PUE 1, all electricity measured, and
// the intensities as given.
func plain(s *grid.Series) footprint.Facts {
	return footprint.Facts{
		Site:    &footprint.Site{Name: "quay-north", Zone: "NORTH", PUE: 1, Series: s},
		Machine: &footprint.Machine{Name: "quad", Units: 4, MeasuredShare: 1},
	}
}

// series has one value for each `every` seconds from start on.
func series(every float64, values ...float64) *grid.Series {
	var steps []grid.Interval
	for n, v := range values {
		steps = append(steps, grid.Interval{From: after(float64(n) * every), To: after(float64(n+1) * every), I: unit.Intensity(v)})
	}
	return grid.NewSeries("NORTH", grid.Average, grid.Direct, steps)
}

// flat is one value for a day.
func flat(g float64) *grid.Series { return series(24*hour, g) }

// value is a figure that must be there.
func value[T ~float64](t test, p *T) float64 {
	t.Helper()
	require.NotNil(t, p, "the figure is absent")
	return float64(*p)
}

func ptr[T any](v T) *T { return &v }

// reasons are the doubts of a run, as text.
func reasons(r *footprint.Run) (all []string) {
	for _, d := range r.Doubts {
		all = append(all, d.Reason)
	}
	return all
}
