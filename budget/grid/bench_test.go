package grid_test

import (
	"fmt"
	"strings"
	"testing"

	"budgetcheck/budget/grid"
	"budgetcheck/budget/unit"
)

// fiveMinutes is a year in steps of five minutes.
func fiveMinutes() *grid.Series {
	steps := make([]grid.Interval, 365*day*12)
	for n := range steps {
		from := midnight.Add(unit.Duration(n) * 5 * unit.Minute)
		steps[n] = grid.Interval{From: from, To: from.Add(5 * unit.Minute), I: unit.Intensity(n % 900)}
	}
	return north(steps...)
}

func BenchmarkAt(b *testing.B) {
	s, n := fiveMinutes(), 0
	for b.Loop() {
		n = (n + 7919) % (365 * day * 12) // all over the year
		if _, ok := s.At(midnight.Add(unit.Duration(n) * 5 * unit.Minute)); !ok {
			b.Fatal("a hole in a series without holes")
		}
	}
}

func BenchmarkExpected(b *testing.B) {
	s := fiveMinutes()
	_, end := s.Span()
	for b.Loop() {
		if _, _, ok := s.Expected(end); !ok {
			b.Fatal("nothing expected after a year")
		}
	}
}

func BenchmarkPriceAfterEnd(b *testing.B) {
	p := grid.Pricer{Series: fiveMinutes()}
	_, end := p.Series.Span()
	for b.Loop() {
		if p.At(end).Source != grid.FromExpected {
			b.Fatal("not expected")
		}
	}
}

// BenchmarkSetOfDays reads and lays over one another a year of hourly rows, one
// file a day, as feeds are kept in repositories.
func BenchmarkSetOfDays(b *testing.B) {
	texts := make([]string, 365)
	var size int
	for d := range texts {
		text := header
		for h := range day {
			at := float64(d*day + h)
			text += rows("NORTH", grid.Average, step(at, at+1, float64(d+h)))
		}
		texts[d] = text
		size += len(text)
	}
	b.SetBytes(int64(size))
	for b.Loop() {
		files := make([]*grid.File, len(texts))
		for d, text := range texts {
			f, err := grid.ReadCSV(strings.NewReader(text), fmt.Sprintf("grid/%03d.csv", d), grid.Columns{})
			if err != nil {
				b.Fatal(err)
			}
			files[d] = f
		}
		s := grid.NewSet(grid.Direct, files...).Series("NORTH", grid.Average)
		if len(s.Steps()) != 365*day {
			b.Fatal("rows are missing")
		}
	}
}
