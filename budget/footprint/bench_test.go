package footprint_test

import (
	"bytes"
	"encoding/json"
	"fmt"
	"testing"
	"time"

	"budgetcheck/budget/footprint"
	"budgetcheck/budget/grid"
	"budgetcheck/budget/record"
	"budgetcheck/budget/unit"
)

const (
	benchMeters  = 8
	benchSeconds = 86400
)

// day is the record of a day: 8 meters, one reading a second each.
func day() []byte {
	var b bytes.Buffer
	b.Grow(52 << 20)
	b.WriteString(`{"k":"open","format":1,"run":"r1","job":"retrain-tide","at":"2031-03-04T00:00:00Z"}` + "\n")
	at := time.Date(2031, 3, 4, 0, 0, 0, 0, time.UTC)
	for s := range benchSeconds {
		stamp := at.Add(time.Duration(s) * time.Second).Format(time.RFC3339)
		for m := range benchMeters {
			fmt.Fprintf(&b, `{"k":"power","at":"%s","meter":"gpu%d","w":%.1f}`+"\n", stamp, m, 250+float64((s*31+m*97)%3000)/10)
		}
	}
	return b.Bytes()
}

// seventyTwo is an hourly series of 72 hours around that day.
func seventyTwo() *grid.Series {
	var steps []grid.Interval
	from := unit.At(time.Date(2031, 3, 3, 0, 0, 0, 0, time.UTC))
	for n := range 72 {
		at := from.Add(unit.Duration(n) * unit.Hour)
		steps = append(steps, grid.Interval{From: at, To: at.Add(unit.Hour), I: unit.Intensity(100 + n)})
	}
	return grid.NewSeries("NORTH", grid.Average, grid.Direct, steps)
}

// BenchmarkWeigh weighs that record, beside the least that a program with the
// standard library does for its energy alone.
func BenchmarkWeigh(b *testing.B) {
	text, f := day(), plain(seventyTwo())
	var ours, theirs float64
	b.Run("reader and weigh", func(b *testing.B) {
		b.SetBytes(int64(len(text)))
		b.ReportAllocs()
		for b.Loop() {
			r, err := record.NewReader(bytes.NewReader(text), "day.ndjson")
			if err != nil {
				b.Fatal(err)
			}
			p, err := footprint.Weigh(r, method, func(*record.Open) footprint.Facts { return f })
			if err != nil {
				b.Fatal(err)
			}
			ours = float64(*footprint.Combine([]*footprint.Part{p}, method).Measured)
		}
	})
	b.Run("reader alone", func(b *testing.B) {
		b.SetBytes(int64(len(text)))
		for b.Loop() {
			r, err := record.NewReader(bytes.NewReader(text), "day.ndjson")
			for err == nil {
				_, err = r.Next()
			}
		}
	})
	b.Run("encoding/json", func(b *testing.B) {
		b.SetBytes(int64(len(text)))
		b.ReportAllocs()
		for b.Loop() {
			theirs = trapezoids(b, text)
		}
	})
	if ours != 0 && theirs != 0 && (ours-theirs > 1e-9*ours || theirs-ours > 1e-9*ours) {
		b.Errorf("%v kWh and %v kWh", ours, theirs)
	}
}

// trapezoids adds up the record's energy line by line.
func trapezoids(b *testing.B, text []byte) (kwh float64) {
	type reading struct {
		K, Meter string
		At       time.Time
		W        float64
	}
	last := map[string]reading{}
	for line := range bytes.Lines(text) {
		var l reading
		if err := json.Unmarshal(line, &l); err != nil {
			b.Fatal(err)
		}
		if before, ok := last[l.Meter]; ok && l.K == "power" {
			kwh += (before.W + l.W) / 2 * l.At.Sub(before.At).Seconds() / 3.6e6
		}
		last[l.Meter] = l
	}
	return kwh
}
