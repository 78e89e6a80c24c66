package unit

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
)

// step is one unit of a quantity and its size in the base unit.
type step struct {
	symbol string
	size   float64
}

// scale is how one quantity is written: the prefixes it prints with, smallest
// first, and further units it accepts.
type scale struct {
	what    string // "a mass"
	example string
	prints  []step
	accepts []step
}

// parse reads a number and a unit of the scale. Values are finite and not
// negative: none of the quantities that people write here can be.
func (s *scale) parse(text string) (float64, error) {
	number, symbol, err := split(text)
	if err != nil {
		return 0, fmt.Errorf("%q is not %s: %w; write it like %q", clip(text), s.what, err, s.example)
	}
	size, ok := s.size(symbol)
	if !ok {
		return 0, fmt.Errorf("%q is not %s: %s; use one of %s, like %q",
			clip(text), s.what, unknown(symbol), s.symbols(), s.example)
	}
	value := number * size
	if math.IsInf(value, 0) {
		return 0, fmt.Errorf("%q is not %s: too large", clip(text), s.what)
	}
	return value, nil
}

func unknown(symbol string) string {
	if symbol == "" {
		return "it has no unit"
	}
	return fmt.Sprintf("unknown unit %q", clip(symbol))
}

func (s *scale) size(symbol string) (float64, bool) {
	for _, list := range [][]step{s.prints, s.accepts} {
		i := slices.IndexFunc(list, func(st step) bool { return st.symbol == symbol })
		if i >= 0 {
			return list[i].size, true
		}
	}
	return 0, false
}

func (s *scale) symbols() string {
	var names []string
	for _, st := range s.prints {
		names = append(names, st.symbol)
	}
	return strings.Join(names, ", ")
}

// text prints value, in base units, with the given number of significant
// figures and the largest prefix that keeps at least one figure before the
// point. The prefix is chosen after rounding: 999.9 g is 1.00 kg.
func (s *scale) text(value float64, digits int) string {
	if value == 0 {
		return "0 " + s.base()
	}
	rounded := math.Abs(round(value, digits))
	best := s.prints[0]
	for _, st := range s.prints[1:] {
		// The factor absorbs the representation error of sizes below one.
		if rounded >= st.size*(1-1e-12) {
			best = st
		}
	}
	return figures(value/best.size, digits) + " " + best.symbol
}

// base is the symbol that zero prints with: that of the base unit, else (for
// shares, in per cent) the smallest.
func (s *scale) base() string {
	i := slices.IndexFunc(s.prints, func(st step) bool { return st.size == 1 })
	return s.prints[max(i, 0)].symbol
}

// split cuts text into its number and what follows it.
func split(text string) (number float64, rest string, err error) {
	text = strings.TrimSpace(text)
	end := numberEnd(text)
	if end == 0 {
		return 0, "", fmt.Errorf("no number at the start")
	}
	number, err = strconv.ParseFloat(text[:end], 64)
	if err != nil {
		return 0, "", fmt.Errorf("the number is too large")
	}
	return number, strings.TrimSpace(text[end:]), nil
}

// numberEnd is the length of the unsigned decimal number that text starts
// with, or 0. An exponent counts only when digits follow it, so that the unit
// may start with e.
func numberEnd(text string) int {
	whole := digits(text)
	end := whole
	if strings.HasPrefix(text[end:], ".") {
		fraction := digits(text[end+1:])
		if whole+fraction == 0 {
			return 0
		}
		end += 1 + fraction
	}
	if end == 0 {
		return 0
	}
	if rest := text[end:]; len(rest) > 1 && (rest[0] == 'e' || rest[0] == 'E') {
		sign := 1
		if rest[1] == '+' || rest[1] == '-' {
			sign = 2
		}
		if n := digits(rest[sign:]); n > 0 {
			end += sign + n
		}
	}
	return end
}

func digits(text string) int {
	for i, c := range []byte(text) {
		if c < '0' || c > '9' {
			return i
		}
	}
	return len(text)
}

// clip keeps a quotation of somebody's input short.
func clip(text string) string {
	const most = 40
	if r := []rune(text); len(r) > most {
		return string(r[:most]) + "..."
	}
	return text
}

// round rounds value to the given number of significant decimal figures.
func round(value float64, digits int) float64 {
	r, err := strconv.ParseFloat(strconv.FormatFloat(value, 'e', digits-1, 64), 64)
	if err != nil { // beyond the largest float
		return value
	}
	return r
}

// figures prints value with the given number of significant figures, without
// an exponent as long as that stays readable.
func figures(value float64, digits int) string {
	if value == 0 {
		return "0"
	}
	rounded := round(value, digits)
	exponent := int(math.Floor(math.Log10(math.Abs(rounded)) + 1e-12))
	if exponent < -4 || exponent > 9 {
		return strconv.FormatFloat(value, 'e', digits-1, 64)
	}
	return strconv.FormatFloat(rounded, 'f', max(digits-1-exponent, 0), 64)
}
