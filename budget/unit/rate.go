package unit

import (
	"fmt"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// Work is an amount of work in functional units, "100000 step"
// (ISO/IEC 21031:2024: the R of the rate).
type Work struct {
	Amount float64
	Unit   string // one word, never empty in a parsed value
}

// ParseWork reads text like "100000 step".
func ParseWork(text string) (Work, error) {
	number, word, err := split(text)
	amount, notFinite := strconv.ParseFloat(number, 64)
	if err != nil || notFinite != nil || amount == 0 || !oneWord(word) {
		return Work{}, fmt.Errorf("%q is not an amount of work; write a number above zero and one word, like %q",
			clip(text), "100000 step")
	}
	return Work{amount, word}, nil
}

func (w Work) String() string { return figures(w.Amount, 3) + " " + w.Unit }

// Set parses text into the value.
func (w *Work) Set(text string) error { return set(w, text, ParseWork) }

// Rate is emissions per work: Mass for every Per units of work.
type Rate struct {
	Mass Mass
	Per  float64 // above zero
	Unit string  // the functional unit, one word
}

// ParseRate reads text like "1.2 g per 1000 step" or "3 mg per token".
func ParseRate(text string) (Rate, error) {
	mass, per, found := strings.Cut(text, " per ")
	if !found {
		return Rate{}, fmt.Errorf("%q is not a rate; write it like %q", clip(text), "1.2 g per 1000 step")
	}
	m, err := ParseMass(mass)
	if err != nil {
		return Rate{}, fmt.Errorf("%q is not a rate: %w", clip(text), err)
	}
	work := Work{1, strings.TrimSpace(per)}
	if !oneWord(work.Unit) {
		if work, err = ParseWork(per); err != nil {
			return Rate{}, fmt.Errorf("%q is not a rate: %w", clip(text), err)
		}
	}
	return Rate{m, work.Amount, work.Unit}, nil
}

// RateOf is the rate of mass m over work w, told per the given amount.
func RateOf(m Mass, w Work, per float64) Rate {
	return Rate{Mass(float64(m) / w.Amount * per), per, w.Unit}
}

// PerUnit is the mass for one functional unit.
func (r Rate) PerUnit() Mass { return Mass(float64(r.Mass) / r.Per) }

// Text prints the rate with the given number of significant figures of mass.
func (r Rate) Text(digits int) string { return r.Worded(r.Mass.Text(digits)) }

// Worded puts a mass that is already printed before the rate's amount of work.
func (r Rate) Worded(mass string) string {
	if r.Per == 1 {
		return mass + " per " + r.Unit
	}
	return mass + " per " + strconv.FormatFloat(r.Per, 'f', -1, 64) + " " + r.Unit
}

func (r Rate) String() string { return r.Text(3) }

// Set parses text into the value.
func (r *Rate) Set(text string) error { return set(r, text, ParseRate) }

// oneWord tells whether s can name a functional unit. The letter at its start
// keeps what is left of a misread number, like ",000step", from naming one.
func oneWord(s string) bool {
	first, _ := utf8.DecodeRuneInString(s)
	return unicode.IsLetter(first) && !strings.ContainsFunc(s, unicode.IsSpace)
}
