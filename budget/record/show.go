package record

import (
	"bytes"
	"strconv"
	"strings"
)

// quote shows text from a record in a message: escaped, and cut when long.
func quote(s string) string { return strconv.QuoteToASCII(string(clip([]byte(s)))) }

// show is quote for JSON as it stands in the record, quotation marks included.
func show(raw []byte) string {
	var b strings.Builder
	for _, r := range string(clip(raw)) {
		if r >= ' ' && r <= '~' {
			b.WriteRune(r)
		} else {
			b.WriteString(strings.Trim(strconv.QuoteRuneToASCII(r), "'"))
		}
	}
	return b.String()
}

func clip(raw []byte) []byte {
	const most = 60
	if len(raw) > most {
		return append(bytes.ToValidUTF8(bytes.Clone(raw[:most]), nil), "..."...)
	}
	return raw
}
