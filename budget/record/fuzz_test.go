package record

import (
	"bytes"
	"encoding/json"
	"runtime"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// FuzzReader: whatever a file holds, the reader comes to an end without a
// panic, keeps the order of the record, and gives messages with a place.
func FuzzReader(f *testing.F) {
	whole := text(opening, power(1, "gpu0", 400), power(1, "gpu0", 400), wrapping(2, "cpu", 7, 100), used(2, 3, 0.5), work(3, "step", 5), closing(4, "ok"))
	for _, record := range []string{"", "\n", whole, whole[:len(whole)-9], whole + whole, "\ufeff" + whole, strings.ReplaceAll(whole, "\n", "\r\n"),
		"\x1f\x8b", "\x1f\x8b\x08\x00", "\x28\xb5\x2f\xfd\x00", "{}\n[]\nnull\n", strings.ReplaceAll(whole, "2031", "1677"), "{\"k\":\"\xff\"}\n"} {
		f.Add([]byte(record))
	}
	for _, packed := range packedSeeds(f, whole) {
		f.Add(packed)
	}
	f.Fuzz(func(t *testing.T, record []byte) {
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		got, err := tryRead(t, bytes.NewReader(record))
		runtime.ReadMemStats(&after)
		if err != nil {
			assert.ErrorContains(t, err, "tide.ndjson: ")
		}
		if !bytes.HasPrefix(record, []byte("\x1f\x8b")) && !bytes.HasPrefix(record, []byte("\x28\xb5")) { // those unpack to any length
			assert.Less(t, after.TotalAlloc-before.TotalAlloc, uint64(32<<20+1000*len(record)), "memory is bounded")
		}
		inOrder(t, got)
	})
}

func packedSeeds(f *testing.F, text string) (seeds [][]byte) {
	for method := range compressors {
		var b bytes.Buffer
		z := compressors[method](&b)
		_, err := z.Write([]byte(text))
		require.NoError(f, err)
		require.NoError(f, z.Close())
		seeds = append(seeds, b.Bytes(), b.Bytes()[:b.Len()-9])
	}
	return seeds
}

// inOrder checks what the footprint relies on in the lines that count.
func inOrder(t *testing.T, got reading) {
	last := map[int]Line{}
	for i, l := range got.lines {
		assert.Equal(t, i == 0, l.Kind == KindOpen)
		assert.GreaterOrEqual(t, l.At, got.lines[0].At)
		switch l.Kind {
		case KindPower, KindEnergy:
			require.Less(t, l.Meter, len(got.meters))
			if before, known := last[l.Meter]; known {
				assert.Greater(t, l.At, before.At)
				assert.Equal(t, before.Kind, l.Kind)
				assert.Equal(t, before.Wrap, l.Wrap)
			}
			last[l.Meter] = l
			assert.GreaterOrEqual(t, l.reading(), 0.0)
		case KindUsed:
			assert.Less(t, l.Used.From, l.Used.To)
		case KindClose:
			assert.Equal(t, len(got.lines)-1, i)
		}
	}
}

// FuzzScanAgainstDecode holds the fast path against the general one, also for a
// line that comes after another, and the general one against the standard library.
func FuzzScanAgainstDecode(f *testing.F) {
	lines := []string{opening, power(1, "gpu0", 412.5), energy(1, "cpu", 7), wrapping(1, "cpu", 7, 262144), used(1, 2, 0.5), work(1, "step", 5),
		closing(1, "ok"), power(1, "gpu0", "0.000000000000001"), power(1, "gpu0", "999999999999999"), power(1, "gpu0", "1e3"), power(1, "gpu0", "-0"),
		`{ "w" : 1 , "meter" : "a" , "at" : "2031-03-04T02:15:00.123456789+05:30" , "k" : "power" }`, `{"k":"power","k":"power"}`, `{"k":"power",}`,
		`{"n":-1e5,"k":"power","at":"2031-03-04T02:15:00Z","meter":"a","w":1,"n":"b","ok":true}`}
	for i := range lines {
		f.Add([]byte(lines[i]), []byte(lines[(i+1)%len(lines)]))
		f.Add([]byte(lines[i]), []byte(lines[i]))
	}
	f.Fuzz(func(t *testing.T, first, second []byte) {
		var s scanner
		for _, line := range [][]byte{first, second, first} {
			agree(t, &s, line)
			sound(t, line)
		}
	})
}

// sound checks the general path: what it takes is JSON, what it refuses is told.
func sound(t *testing.T, line []byte) {
	_, _, _, wrong := decode(line, nil)
	if wrong == nil {
		assert.True(t, json.Valid(line), "%q", line)
		assert.True(t, bytes.HasPrefix(trim(line), []byte("{")), "%q", line)
		return
	}
	assert.NotEmpty(t, wrong.What)
	assert.NotEmpty(t, wrong.Do)
	for _, r := range wrong.String() {
		assert.True(t, r >= ' ' && r != 0x7f, "control character in %q", wrong)
	}
}
