package footprint_test

import (
	"bytes"
	"fmt"
	"slices"

	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

// sample is one reading of a drawn meter; at is in nanoseconds from open.
type sample struct {
	at    int64
	value float64 // W, or J of a counter
}

// meter is a drawn meter.
type meter struct {
	name    string
	counter bool
	wrap    float64 // J; 0 is not said
	samples []sample
}

// drawn is a drawn record: meters between open at 0 and close at end.
type drawn struct {
	meters []meter
	end    int64 // ns
}

const tenth = int64(1e8) // ns; drawn times are tenths of seconds

// eighths draws a value that a record writes and reads without rounding.
func eighths(t *rapid.T, most int, label string) float64 {
	return float64(rapid.IntRange(0, 8*most).Draw(t, label)) / 8
}

// pause draws the time between two samples: usual ones, ones about max_gap,
// and long ones.
func pause(t *rapid.T) int64 {
	return tenth * rapid.OneOf(rapid.Int64Range(1, 600), rapid.Int64Range(1, 600), rapid.Int64Range(1199, 1201), rapid.Int64Range(1, 72000)).Draw(t, "pause")
}

// drawRecord draws a record with gaps, edges, and counters that wrap and reset.
func drawRecord(t *rapid.T) drawn {
	var d drawn
	for n := range rapid.IntRange(1, 4).Draw(t, "meters") {
		m := meter{name: fmt.Sprintf("m%d", n), counter: rapid.Bool().Draw(t, "counter")}
		if m.counter && rapid.Bool().Draw(t, "wraps") {
			m.wrap = 20000
		}
		at := rapid.SampledFrom([]int64{0, 0, 10 * tenth, 1200 * tenth, 5000 * tenth}).Draw(t, "first")
		for range rapid.IntRange(1, 12).Draw(t, "samples") {
			m.samples = append(m.samples, sample{at, eighths(t, 2000, "value") * m.scale()})
			at += pause(t)
		}
		d.meters = append(d.meters, m)
		d.end = max(d.end, m.samples[len(m.samples)-1].at)
	}
	d.end += rapid.SampledFrom([]int64{0, 10 * tenth, 1200 * tenth, 9000 * tenth}).Draw(t, "last edge")
	return d
}

// scale makes counters fall now and then: they go up to their wrap.
func (m meter) scale() float64 {
	if m.counter {
		return 10
	}
	return 1
}

// gapless draws meters that are read at the same times from open to close, never
// further apart than max_gap.
func gapless(t *rapid.T) drawn {
	var d drawn
	times := []int64{0}
	for range rapid.IntRange(1, 20).Draw(t, "samples") {
		times = append(times, times[len(times)-1]+tenth*rapid.Int64Range(1, 1200).Draw(t, "pause"))
	}
	d.end = times[len(times)-1]
	for n := range rapid.IntRange(1, 4).Draw(t, "meters") {
		m := meter{name: fmt.Sprintf("m%d", n)}
		for _, at := range times {
			m.samples = append(m.samples, sample{at, 1 + eighths(t, 2000, "value")})
		}
		d.meters = append(d.meters, m)
	}
	return d
}

// lines are the meter's lines as a record has them.
func (m meter) lines(t test, opens unit.Instant) (lines [][]byte) {
	for n, s := range m.samples {
		var b bytes.Buffer
		w, at := record.NewWriter(&b), opens.Add(unit.Duration(s.at))
		switch {
		case !m.counter:
			require.NoError(t, w.Power(at, m.name, unit.Power(s.value)))
		case n == 0:
			require.NoError(t, w.Energy(at, m.name, unit.Joules(s.value), unit.Joules(m.wrap)))
		default:
			require.NoError(t, w.Energy(at, m.name, unit.Joules(s.value), 0))
		}
		lines = append(lines, b.Bytes())
	}
	return lines
}

// sheet writes the record, meter after meter.
func (d drawn) sheet(t test, edits ...func(*record.Open)) *sheet {
	return d.inTurn(t, func(left [][][]byte) int {
		return slices.IndexFunc(left, func(lines [][]byte) bool { return len(lines) > 0 })
	}, edits...)
}

// inTurn writes the record; next picks the meter whose line comes next.
func (d drawn) inTurn(t test, next func(left [][][]byte) int, edits ...func(*record.Open)) *sheet {
	s := open(t, edits...)
	var left [][][]byte
	var opens unit.Instant
	var o record.Open
	for _, edit := range append([]func(*record.Open){opensAt(0)}, edits...) {
		edit(&o)
	}
	opens = o.At
	total := 0
	for _, m := range d.meters {
		left = append(left, m.lines(t, opens))
		total += len(m.samples)
	}
	for range total {
		n := next(left)
		s.text.Write(left[n][0])
		left[n] = left[n][1:]
	}
	require.NoError(t, s.w.Close(opens.Add(unit.Duration(d.end)), record.OK))
	return s
}

// drawSeries draws minutes to hours of intensity, mostly without holes, over
// a day and more.
func drawSeries(t *rapid.T, holes bool) *grid.Series {
	pauses := []float64{0}
	if holes {
		pauses = []float64{0, 0, 0, 0, 60, 7}
	}
	var steps []grid.Interval
	for at := rapid.SampledFrom(pauses).Draw(t, "late"); at < 1000; {
		length := rapid.SampledFrom([]float64{5, 15, 30, 60, 90}).Draw(t, "length")
		steps = append(steps, grid.Interval{From: after(at * 60), To: after((at + length) * 60), I: unit.Intensity(1 + eighths(t, 900, "g"))})
		at += length + rapid.SampledFrom(pauses).Draw(t, "hole")
	}
	return grid.NewSeries("NORTH", grid.Average, grid.Direct, steps)
}

// weighDrawn is the run of a drawn record.
func weighDrawn(t test, d drawn, f footprint.Facts, m footprint.Method) *footprint.Run {
	return d.sheet(t).run(f, m)
}
