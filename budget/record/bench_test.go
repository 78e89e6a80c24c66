package record

import (
	"bufio"
	"bytes"
	"encoding/json"
	"fmt"
	"io"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"

	"budgetcheck/budget/unit"
)

// The writings of a power line that come before the reader in practice.
const (
	compact = `{"k":"power","at":"%s","meter":"gpu%d","w":%.1f}`
	spaced  = `{"k": "power", "at": "%s", "meter": "gpu%d", "w": %.1f}` // as Python's json.dumps writes
	further = `{"k":"power","at":"%s","meter":"gpu%d","w":%.1f,"host":"h3"}`
	general = `{"k":"power","at":"%s","meter":"gpu\u003%d","w":%.1f}` // an escape sends it the general way
)

// samples makes the lines of 8 meters in turns, one round a second, as they are
// read: no record has to be kept.
type samples struct {
	shape string
	left  int // lines to come
	made  int
	rest  []byte
}

func (s *samples) Read(p []byte) (int, error) {
	if len(s.rest) == 0 {
		if s.left == 0 {
			return 0, io.EOF
		}
		s.rest = s.rest[:0]
		for ; s.left > 0 && len(s.rest) < 60<<10; s.left-- {
			at := start.Add(unit.Duration(s.made/8) * unit.Second)
			s.rest = fmt.Appendf(s.rest, s.shape+"\n", at, s.made%8, 300+float64(s.made%1999)/10)
			s.made++
		}
	}
	n := copy(p, s.rest)
	s.rest = s.rest[n:]
	return n, nil
}

func sampled(shape string, lines int) io.Reader {
	return io.MultiReader(strings.NewReader(opening+"\n"), &samples{shape: shape, left: lines})
}

// count reads to the end and gives the number of lines that counted.
func count(t require.TestingT, r *Reader) (lines int) {
	for {
		_, err := r.Next()
		if err != nil {
			require.ErrorIs(t, err, io.EOF)
			return lines
		}
		lines++
	}
}

func BenchmarkReader(b *testing.B) {
	const lines = 200_000
	for name, shape := range map[string]string{"compact": compact, "spaced": spaced, "further": further, "general": general} {
		record, err := io.ReadAll(sampled(shape, lines))
		require.NoError(b, err)
		b.Run(name, func(b *testing.B) {
			b.SetBytes(int64(len(record)))
			b.ReportAllocs()
			for b.Loop() {
				r, err := NewReader(bytes.NewReader(record), "tide.ndjson")
				require.NoError(b, err)
				require.Equal(b, lines+1, count(b, r))
			}
		})
	}
}

// BenchmarkStandardLibrary is the yardstick: the same bytes through encoding/json
// with nothing checked.
func BenchmarkStandardLibrary(b *testing.B) {
	record, err := io.ReadAll(sampled(compact, 200_000))
	require.NoError(b, err)
	b.SetBytes(int64(len(record)))
	for b.Loop() {
		lines := bufio.NewScanner(bytes.NewReader(record))
		for lines.Scan() {
			var line struct {
				K, At, Meter string
				W            float64
			}
			require.NoError(b, json.Unmarshal(lines.Bytes(), &line))
		}
	}
}
