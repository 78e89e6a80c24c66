package grid

import (
	"fmt"
	"slices"

	"budgetcheck/budget/unit"
)

// Source tells where the price of a span of time comes from.
type Source uint8

// The sources, best first.
const (
	FromSeries   Source = iota // the series itself
	FromExpected               // after the series' end
	FromAnnual                 // the site's annual mean, where the zone has no series
	FromHole                   // in a hole of the series: Annual if Known, and only for a small share
)

var sourceWords = [...]string{"series", "expected", "annual", "hole"}

func (s Source) String() string { return sourceWords[s] }

// MarshalText writes the source as a word.
func (s Source) MarshalText() ([]byte, error) { return []byte(s.String()), nil }

// UnmarshalText reads a word.
func (s *Source) UnmarshalText(text []byte) error {
	n := slices.Index(sourceWords[:], string(text))
	if n < 0 {
		return fmt.Errorf("%q is no source of a price; write one of %v", text, sourceWords)
	}
	*s = Source(n)
	return nil
}

// Price is what a kilowatt-hour is charged with over one span of time.
type Price struct {
	Until  unit.Instant   // the end of the span
	I      unit.Intensity // meaningless unless Known
	U      unit.Share     // relative standard uncertainty of an expected intensity
	Source Source
	Known  bool
}

// Pricer prices the hours of a site. Series is nil where the zone has none;
// Annual is nil where none is declared, or where it must not be used.
type Pricer struct {
	Series *Series
	Annual *unit.Intensity
}

// At is the price at t and how long it holds.
func (p Pricer) At(t unit.Instant) Price {
	if p.Series == nil {
		return p.annual(FromAnnual, endless)
	}
	if i, ok := p.Series.At(t); ok {
		return Price{Until: p.Series.next(t), I: i, Source: FromSeries, Known: true}
	}
	if _, end := p.Series.Span(); t < end {
		return p.annual(FromHole, p.Series.next(t))
	}
	until := p.Series.expectedUntil(t)
	if i, u, ok := p.Series.Expected(t); ok {
		return Price{Until: until, I: i, U: u, Source: FromExpected, Known: true}
	}
	return p.annual(FromHole, until)
}

func (p Pricer) annual(s Source, until unit.Instant) Price {
	price := Price{Until: until, Source: s}
	if p.Annual != nil {
		price.I, price.Known = *p.Annual, true
	}
	return price
}
