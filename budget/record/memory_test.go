package record

import (
	"io"
	"runtime"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// lowMemory reads r to the end and checks that what is alive stays small,
// however long the record is.
func lowMemory(t *testing.T, in io.Reader) (r *Reader, lines int) {
	const most = 8 << 20
	before := alive()
	r, err := NewReader(in, "tide.ndjson")
	require.NoError(t, err)
	for ; err == nil; lines++ {
		if _, err = r.Next(); err != nil || lines%100_000 == 0 {
			require.Less(t, alive()-before, int64(most), "after %d lines", lines)
		}
	}
	require.ErrorIs(t, err, io.EOF)
	return r, lines - 1
}

// alive is the size of what is in use, not of what is yet to be swept.
func alive() int64 {
	var m runtime.MemStats
	runtime.GC()
	runtime.ReadMemStats(&m)
	return int64(m.HeapAlloc)
}

func linesOf(megabytes int) int { return megabytes << 20 / len(power(1, "gpu0", 412.5)) }

// TestLongRecordNeedsLittleMemory: 200 MB of samples, made as they are read.
func TestLongRecordNeedsLittleMemory(t *testing.T) {
	n := linesOf(200)
	if testing.Short() {
		n = linesOf(10)
	}
	r, lines := lowMemory(t, sampled(compact, n))
	assert.Equal(t, n+1, lines)
	assert.Zero(t, r.Findings().Len())
}

// TestBadRecordNeedsLittleMemory: nor does a record that is wrong in every line.
func TestBadRecordNeedsLittleMemory(t *testing.T) {
	n := linesOf(8)
	if testing.Short() {
		n = linesOf(1)
	}
	for name, shape := range map[string]string{
		"repeated":     strings.Replace(compact, `"at":"%s"`, `"at":"2031-03-04T02:15:00Z","meter":"x%s"`, 1),
		"out of order": strings.Replace(compact, `"at":"%s"`, `"at":"2031-03-04T02:14:00Z","note":"%s"`, 1),
		"no number":    strings.Replace(compact, "%.1f", `"%.1f"`, 1),
		"no end":       strings.Replace(compact, "}", "", 1),
		"new kinds":    strings.Replace(compact, "power", "heat", 1),
	} {
		r, lines := lowMemory(t, sampled(shape, n))
		assert.Equal(t, 1, lines, name)
		assert.Equal(t, n, r.Findings().Len()+r.Unknown().Len(), name)
	}
}

// TestEndlessLineNeedsLittleMemory: a file that is no record at all may have no
// newline in it.
func TestEndlessLineNeedsLittleMemory(t *testing.T) {
	n := linesOf(100)
	if testing.Short() {
		n = linesOf(10)
	}
	r, lines := lowMemory(t, &endless{left: n})
	assert.Zero(t, lines)
	assert.Equal(t, 1, r.Findings().Len())
}

type endless struct{ left int }

func (e *endless) Read(p []byte) (int, error) {
	if e.left == 0 {
		return 0, io.EOF
	}
	e.left--
	return copy(p, power(1, "gpu0", 412.5)), nil
}
