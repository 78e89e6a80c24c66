package record

import (
	"errors"
	"io"
	"strings"
	"testing"
	"testing/iotest"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// TestTornLastLine: a killed job may leave half a line. Wherever the tear is,
// that line only is lost, and it is said; a whole line counts without its newline.
func TestTornLastLine(t *testing.T) {
	before := text(opening, power(1, "gpu0", 400))
	last := strings.Replace(power(2, "gpu0", 401), "gpu0", "gäu0", 1)
	for cut := 1; cut < len(last); cut++ {
		got := read(t, before+last[:cut])
		assert.Empty(t, got.findings, last[:cut])
		assert.Equal(t, []string{"tide.ndjson:3: the last line is torn and was dropped"}, got.notes)
		assert.Equal(t, []int{1, 2}, got.numbers())
	}
	got := read(t, before+last)
	assert.Empty(t, got.notes)
	assert.Equal(t, []int{1, 2, 3}, got.numbers())
	got = read(t, before+`"text"`)
	assert.Len(t, got.findings, 1, "a last line that is whole and wrong is not torn")
	got = read(t, text(opening, last[:30], closing(3, "ok")))
	assert.Len(t, got.findings, 1, "nor is one with a newline")
	got = read(t, before+"\x00\x00\x00\x00")
	assert.Equal(t, []string{"tide.ndjson:3: the last line is torn and was dropped"}, got.notes, "some file systems leave zeros after a crash")
}

func TestEmptyRecords(t *testing.T) {
	const empty = "tide.ndjson:1: the record has no open line; a job that ran writes one first"
	for _, record := range []string{"", "\n", "\r\n \t\n\n", "\ufeff", "{", `{"k":"op`, `{"k":"heat"}` + "\n"} {
		got := read(t, record)
		assert.Equal(t, []string{empty}, got.findings, "%q", record)
		assert.Empty(t, got.lines)
	}
}

// TestReadingOnAfterTheEnd: the end stays the end, and is complained of once.
func TestReadingOnAfterTheEnd(t *testing.T) {
	for _, record := range []string{"", text(opening), opening, opening + "\n{"} {
		r, err := NewReader(strings.NewReader(record), "tide.ndjson")
		require.NoError(t, err)
		for err == nil {
			_, err = r.Next()
		}
		findings, notes := r.Findings().Len(), r.Notes()
		for range 3 {
			_, err = r.Next()
			assert.Equal(t, io.EOF, err)
		}
		assert.Equal(t, findings, r.Findings().Len())
		assert.Equal(t, notes, r.Notes())
	}
}

// TestWhiteSpace: line ends of another system, a byte order mark, blank lines
// and spaces change nothing but the numbers of the lines.
func TestWhiteSpace(t *testing.T) {
	lines := []string{opening, power(1, "gpu0", 400), work(2, "step", 5), closing(3, "ok")}
	want := read(t, text(lines...))
	same := func(record string, numbers ...int) {
		got := read(t, record)
		assert.Empty(t, got.findings)
		assert.Empty(t, got.notes)
		require.Equal(t, numbers, got.numbers())
		for i := range got.lines {
			got.lines[i].No = want.lines[i].No
		}
		assert.Equal(t, want.lines, got.lines)
	}
	same(strings.Join(lines, "\r\n")+"\r\n", 1, 2, 3, 4)
	same("\ufeff"+text(lines...), 1, 2, 3, 4)
	same("\n\n"+strings.Join(lines, "\n \n\t\r\n")+"\n\n\n", 3, 6, 9, 12)
	same("  "+strings.Join(lines, " \t\n\t ")+"\t", 1, 2, 3, 4)
}

// TestLongLines: a line at the limit is read, one beyond is refused, and the
// lines after it are read with their right numbers.
func TestLongLines(t *testing.T) {
	const message = "tide.ndjson:2: the line is longer than 1048576 bytes; write one JSON object a line, each ended by a newline"
	padded := func(n int) string {
		line := power(1, "gpu0", 400)
		return line[:len(line)-1] + strings.Repeat(" ", n-len(line)) + "}"
	}
	for _, ending := range []string{"\n", ""} {
		got := read(t, opening+"\n"+padded(MaxLine)+ending)
		assert.Empty(t, got.findings)
		assert.Equal(t, []int{1, 2}, got.numbers())
	}
	for _, n := range []int{MaxLine + 1, MaxLine + 2, 2*MaxLine + 1, 2*MaxLine + 2, 5*MaxLine + 77} {
		for _, rest := range []string{"", "\n", "\n" + power(3, "gpu0", 401), "\n" + power(3, "gpu0", 401) + "\n"} {
			got := read(t, opening+"\n"+padded(n)+rest)
			assert.Equal(t, []string{message}, got.findings)
			assert.Empty(t, got.notes)
			if len(rest) > 1 {
				assert.Equal(t, []int{1, 3}, got.numbers())
			} else {
				assert.Equal(t, []int{1}, got.numbers())
			}
		}
	}
}

// TestReadsInPieces: it does not matter in what pieces the bytes arrive.
func TestReadsInPieces(t *testing.T) {
	record := text(opening, power(1, "gpu0", 400), "", power(1, "gpu0", 401), work(2, "step", 5)) + closing(3, "ok")[:20]
	want := read(t, record)
	for name, wrap := range map[string]func(io.Reader) io.Reader{"one byte": iotest.OneByteReader, "half": iotest.HalfReader, "error with data": iotest.DataErrReader} {
		got, err := tryRead(t, wrap(strings.NewReader(record)))
		require.NoError(t, err)
		assert.Equal(t, want, got, name)
	}
}

// TestFailureToRead: a disk that fails is an error, not a finding; it names the
// file, and what was read before it stays.
func TestFailureToRead(t *testing.T) {
	broken := errors.New("input/output error")
	for _, before := range []string{"", "{", opening + "\n", opening + "\n" + power(1, "gpu0", 400)[:20]} {
		got, err := tryRead(t, io.MultiReader(strings.NewReader(before), iotest.ErrReader(broken)))
		require.ErrorIs(t, err, broken)
		assert.ErrorContains(t, err, "tide.ndjson")
		assert.Empty(t, got.findings)
	}
}

// TestGeneralPath: lines that the fast path leaves alone say the same.
func TestGeneralPath(t *testing.T) {
	want := read(t, text(opening, power(1, "gpu0", 400.5), wrapping(2, "cpu", 7, 100), power(3, "gpu0", 401), energy(3, "cpu", 8)))
	require.Empty(t, want.findings)
	got := read(t, text(
		strings.Replace(opening, `{"k":"open",`, ` { "k" : "op\u0065n" , `, 1),
		` { "w" : 4.005e2 , "meter" : "gp\u00750" , "at" : "2031-03-04T03:15:01.0+01:00" , "\u006b" : "power" } `,
		`{"wrap_j":1E2,"j":7.0000000000000000,"meter":"cpu","at":`+at(2)+`,"k":"energy"}`,
		`{"k":"power","at":`+at(3)+`,"meter":"gpu0","w":401,"note":"caf\u00e9"}`,
		`{"k":"energy","at":`+at(3)+`,"meter":"cpu","j":8,"wrap_j":null}`,
	))
	assert.Equal(t, want, got)
}
