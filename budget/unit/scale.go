package unit

import (
	"errors"
	"fmt"
	"math"
	"math/big"
	"slices"
	"strconv"
	"strings"
)

// step is one unit of a quantity: size/per of the base unit. Two numbers, for
// a thousandth or a joule is no exact float, and both of these are exact decimals.
type step struct {
	symbol    string
	size, per float64
}

// of is value, in base units, in this unit.
func (st step) of(value float64) float64 { return value / st.size * st.per }

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
	unit, ok := s.find(symbol)
	if !ok {
		return 0, fmt.Errorf("%q is not %s: %s; use one of %s, like %q",
			clip(text), s.what, unknown(symbol), s.symbols(), s.example)
	}
	value, err := unit.times(number)
	if err != nil {
		return 0, fmt.Errorf("%q is not %s: %w; write it like %q", clip(text), s.what, err, s.example)
	}
	return value, nil
}

// unknown says what is wrong with a unit that the scale does not have.
func unknown(symbol string) string {
	if symbol == "" {
		return "it has no unit"
	}
	return fmt.Sprintf("unknown unit %q", clip(symbol))
}

func (s *scale) find(symbol string) (step, bool) {
	for _, list := range [][]step{s.prints, s.accepts} {
		i := slices.IndexFunc(list, func(st step) bool { return st.symbol == symbol })
		if i >= 0 {
			return list[i], true
		}
	}
	return step{}, false
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
// point. What rounds up to the next prefix is one of it: 999.9 g is 1.00 kg.
func (s *scale) text(value float64, digits int) string {
	if value == 0 || digits > 15 { // a prefix would cost the last figures
		return figures(value, digits) + " " + s.base()
	}
	best := s.prints[0]
	for _, st := range s.prints[1:] {
		if math.Abs(round(best.of(value), digits))*best.size*st.per < st.size*best.per {
			break
		}
		best, value = st, math.Copysign(max(math.Abs(value), st.size/st.per), value)
	}
	return figures(best.of(value), digits) + " " + best.symbol
}

// interval prints value ± expanded in one prefix, that of the larger, and with
// the decimals of value's three significant figures.
func (s *scale) interval(value, expanded float64) string {
	larger := max(math.Abs(value), math.Abs(expanded))
	text := s.text(larger, 3)
	number, symbol, _ := strings.Cut(text, " ")
	unit, _ := s.find(symbol)
	decimals := 0
	if _, after, found := strings.Cut(number, "."); found {
		decimals = len(after)
	}
	return strconv.FormatFloat(unit.of(value), 'f', decimals, 64) + " ± " + strconv.FormatFloat(unit.of(expanded), 'f', decimals, 64) + " " + symbol
}

// base is the symbol of the base unit, which every scale with prefixes prints.
func (s *scale) base() string {
	i := slices.IndexFunc(s.prints, func(st step) bool { return st.size == st.per })
	return s.prints[i].symbol
}

// times is number of this unit in base units, computed as decimals and rounded
// once: "1.005 kg" is 1005 g and not the float below it, for exactly at a limit
// is within it, whatever prefix the limit is written in.
func (st step) times(number string) (float64, error) {
	value, err := strconv.ParseFloat(number, 64)
	if err != nil {
		return 0, errors.New("the number is too large")
	}
	if value == 0 { // or too small for a float; as a fraction it could fill the memory
		return 0, nil
	}
	exact, ok := new(big.Rat).SetString(number)
	if !ok { // more than a million digits
		return 0, errors.New("the number is too long")
	}
	exact.Mul(exact, decimal(st.size)).Quo(exact, decimal(st.per))
	value, _ = exact.Float64()
	if math.IsInf(value, 0) {
		return 0, errors.New("the number is too large")
	}
	return value, nil
}

// decimal is a size as it is written above, not as the float beside it.
func decimal(size float64) *big.Rat {
	r, _ := new(big.Rat).SetString(strconv.FormatFloat(size, 'g', -1, 64))
	return r
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
	scientific := strconv.FormatFloat(value, 'e', digits-1, 64)
	_, after, _ := strings.Cut(scientific, "e")
	exponent, err := strconv.Atoi(after)
	if err != nil || exponent < -4 || exponent > 9 { // no exponent: not finite
		return scientific
	}
	return strconv.FormatFloat(round(value, digits), 'f', max(digits-1-exponent, 0), 64)
}
