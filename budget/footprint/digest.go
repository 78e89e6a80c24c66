package footprint

import (
	"crypto/sha256"
	"encoding/binary"
	"encoding/hex"
	"hash"
	"math"

	"budgetcheck/budget/record"
)

// digest hashes the energy lines of a record: kinds, meters by order of first
// appearance, times and values. How they are written does not matter, nor what
// the meters are called, so that a copy under another run's name shows.
type digest struct {
	hash hash.Hash
	buf  []byte
}

func newDigest() *digest {
	const block = 4096
	return &digest{sha256.New(), make([]byte, 0, block)}
}

func (d *digest) sample(l *record.Line, value float64) {
	const size = 1 + 2 + 8 + 8
	if len(d.buf)+size > cap(d.buf) {
		d.hash.Write(d.buf)
		d.buf = d.buf[:0]
	}
	d.buf = append(d.buf, byte(l.Kind))
	d.buf = binary.BigEndian.AppendUint16(d.buf, uint16(l.Meter))
	d.buf = binary.BigEndian.AppendUint64(d.buf, uint64(l.At))
	d.buf = binary.BigEndian.AppendUint64(d.buf, math.Float64bits(value))
}

func (d *digest) sum() string {
	d.hash.Write(d.buf)
	return hex.EncodeToString(d.hash.Sum(nil))
}
