package record

import "math"

// plainText is what of b stands before the quotation mark that ends a string,
// if that is printable ASCII without escapes: it means what it says.
func plainText(b []byte) ([]byte, bool) {
	for i, c := range b {
		switch {
		case c == '"':
			return b[:i], true
		case c == '\\' || c < 0x20 || c >= 0x7f:
			return nil, false
		}
	}
	return nil, false
}

// plainNumber is the number that b starts with and its length, or 0. It takes
// numbers that convert exactly: at most 15 significant digits scaled by a power
// of ten that a float64 holds exactly, so that one division rounds correctly
// (Clinger 1990, PLDI, from memory). Others are left to the general path.
func plainNumber(b []byte) (v float64, length int) {
	i := 0
	var mantissa uint64
	for ; i < len(b) && isDigit(b[i]); i++ {
		mantissa = mantissa*10 + uint64(b[i]-'0')
	}
	whole := i
	if whole == 0 || whole > 1 && b[0] == '0' {
		return 0, 0 // signs and leading zeros
	}
	fraction := 0
	if i < len(b) && b[i] == '.' {
		for i++; i < len(b) && isDigit(b[i]); i++ {
			mantissa = mantissa*10 + uint64(b[i]-'0')
			fraction++
		}
		if fraction == 0 {
			return 0, 0
		}
	}
	if whole+fraction > 15 || i < len(b) && (b[i] == 'e' || b[i] == 'E') {
		return 0, 0
	}
	return float64(mantissa) / powersOfTen[fraction], i
}

var powersOfTen = func() (p [16]float64) {
	for i := range p {
		p[i] = math.Pow10(i)
	}
	return p
}()

func isDigit(c byte) bool { return c-'0' < 10 }

func isSpace(c byte) bool { return c == ' ' || c == '\t' || c == '\r' || c == '\n' }
