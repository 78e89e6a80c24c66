package record

import (
	"bytes"
	"io"
	"reflect"
	"testing"

	"github.com/klauspost/compress/gzip"
	"github.com/klauspost/compress/zstd"
	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// compressors are the two ways in which a record may be compressed.
var compressors = map[string]func(io.Writer) io.WriteCloser{
	"gzip": func(w io.Writer) io.WriteCloser { return gzip.NewWriter(w) },
	"zstd": func(w io.Writer) io.WriteCloser {
		z, err := zstd.NewWriter(w, zstd.WithEncoderConcurrency(1))
		if err != nil {
			panic(err)
		}
		return z
	},
}

func compress(t *testing.T, method, text string) []byte {
	var b bytes.Buffer
	z := compressors[method](&b)
	_, err := io.WriteString(z, text)
	require.NoError(t, err)
	require.NoError(t, z.Close())
	return b.Bytes()
}

// night is a record long enough for several compressed blocks.
func night(samples int) string {
	lines := []string{opening}
	for i := range samples {
		lines = append(lines, power(i+1, "gpu0", 400+i*i%97))
	}
	return text(append(lines, closing(samples+1, "ok"))...)
}

func TestCompressed(t *testing.T) {
	record := night(2000)
	want := read(t, record)
	for method := range compressors {
		packed := compress(t, method, record)
		got, err := tryRead(t, bytes.NewReader(packed))
		require.NoError(t, err)
		assert.Equal(t, want, got, method)

		// Log rotation and resumed jobs put streams one after another.
		half := len(record) / 2
		got, err = tryRead(t, bytes.NewReader(append(compress(t, method, record[:half]), compress(t, method, record[half:])...)))
		require.NoError(t, err)
		assert.Equal(t, want, got, "%s in two streams", method)

		got, err = tryRead(t, bytes.NewReader(compress(t, method, "")))
		require.NoError(t, err)
		assert.Len(t, got.findings, 1, "an empty record is empty when compressed, too")
	}
}

// TestCutShort: wherever a killed job's compressed record ends, what it holds
// is read, it is said that it is cut short, and nothing else is wrong.
func TestCutShort(t *testing.T) {
	const note = "tide.ndjson: the compressed stream is cut short; what it holds was read"
	record := night(8000)
	want := read(t, record)
	for method := range compressors {
		packed := compress(t, method, record)
		partly := 0
		for cut := 4; cut < len(packed); cut += 1 + cut/7 {
			got, err := tryRead(t, bytes.NewReader(packed[:cut]))
			require.NoError(t, err, "%s cut at %d", method, cut)
			assert.Contains(t, got.notes, note, "%s cut at %d", method, cut)
			n := len(got.lines)
			require.Less(t, n, len(want.lines))
			assert.True(t, reflect.DeepEqual(append([]Line{}, want.lines[:n]...), append([]Line{}, got.lines...)), "%s cut at %d", method, cut)
			if n > 0 {
				assert.Empty(t, got.findings, "%s cut at %d", method, cut)
				partly++
			}
		}
		assert.Greater(t, partly, 3, method)
	}
}

// TestCutShortInASecondStream: the tear may be in a later stream's header.
func TestCutShortInASecondStream(t *testing.T) {
	record := text(opening, power(1, "gpu0", 400))
	for method := range compressors {
		packed := compress(t, method, record)
		for cut := 1; cut < len(packed); cut += 3 {
			got, err := tryRead(t, bytes.NewReader(append(bytes.Clone(packed), packed[:cut]...)))
			require.NoError(t, err, "%s cut at %d", method, cut)
			assert.Equal(t, []int{1, 2}, got.numbers()[:2], "%s cut at %d", method, cut)
			assert.NotEmpty(t, got.notes, "%s cut at %d", method, cut)
		}
	}
}

// TestDamaged: a byte that changed is never silent: it gives an error, a
// finding or a note, or it was one that carries nothing of the record.
func TestDamaged(t *testing.T) {
	record := night(50)
	want := read(t, record)
	for method := range compressors {
		packed := compress(t, method, record)
		failures := 0
		step := 1
		if testing.Short() {
			step = 11
		}
		tries := 0
		for i := 4; i < len(packed); i += step {
			tries++
			damaged := bytes.Clone(packed)
			damaged[i] ^= 0x20
			got, err := tryRead(t, bytes.NewReader(damaged))
			if err != nil {
				failures++
				assert.ErrorContains(t, err, "tide.ndjson: the compressed record cannot be read", "%s at %d", method, i)
				assert.ErrorContains(t, err, "; compress the record again", "%s at %d", method, i)
			} else if len(got.findings)+len(got.notes) == 0 {
				assert.Equal(t, want, got, "%s at %d", method, i)
			}
		}
		assert.Greater(t, failures, tries/2, "the checksum of %s is looked at", method)
	}
}

func TestTrailingGarbage(t *testing.T) {
	for method := range compressors {
		_, err := tryRead(t, bytes.NewReader(append(compress(t, method, text(opening)), "this is no stream of any kind"...)))
		assert.ErrorContains(t, err, "tide.ndjson: the compressed record cannot be read", method)
	}
}

// TestHugeWindow: a stream may not ask for more memory than the reader has for
// it; the message says how to write one that does not.
func TestHugeWindow(t *testing.T) {
	for size, fits := range map[int]bool{maxWindow: true, 2 * maxWindow: false} {
		var b bytes.Buffer
		z, err := zstd.NewWriter(&b, zstd.WithWindowSize(size))
		require.NoError(t, err)
		_, err = io.WriteString(z, text(opening))
		require.NoError(t, err)
		require.NoError(t, z.Flush()) // before the end, so that the size is not known
		require.NoError(t, z.Close())
		got, err := tryRead(t, &b)
		if fits {
			require.NoError(t, err)
			assert.Len(t, got.lines, 1)
		} else {
			assert.ErrorContains(t, err, "zstd at level 19 or less")
		}
	}
}
