package unit

import (
	"errors"
	"strings"
)

// split cuts text into its number, unsigned and decimal, and what follows it.
func split(text string) (number, rest string, err error) {
	text = strings.TrimSpace(text)
	end := numberEnd(text)
	number, rest = text[:end], strings.TrimSpace(text[end:])
	switch {
	case strings.HasPrefix(text, "-"):
		return "", "", errors.New("it is below zero")
	case end == 0:
		return "", "", errors.New("no number at the start")
	case strings.HasPrefix(rest, ","):
		return "", "", errors.New("a comma stands in the number")
	}
	return number, rest, nil
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
