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
	hash  hash.Hash
	buf   []byte
	lines int
}

func newDigest() *digest {
	const block = 4096
	return &digest{hash: sha256.New(), buf: make([]byte, 0, block)}
}

// line takes a line of energy.
func (d *digest) line(l *record.Line) {
	const most = 1 + 2 + 4*8
	if len(d.buf)+most > cap(d.buf) {
		d.hash.Write(d.buf)
		d.buf = d.buf[:0]
	}
	d.lines++
	b := append(d.buf, byte(l.Kind))
	b = binary.BigEndian.AppendUint16(b, uint16(l.Meter))
	b = binary.BigEndian.AppendUint64(b, uint64(l.At))
	switch l.Kind {
	case record.KindPower:
		b = number(b, float64(l.Power))
	case record.KindEnergy:
		b = number(number(b, float64(l.Joules)), float64(l.Wrap))
	case record.KindUsed:
		b = binary.BigEndian.AppendUint64(b, uint64(l.Used.From))
		b = append(number(b, float64(l.Used.Energy)), how(l.Used))
	}
	d.buf = b
}

func number(b []byte, v float64) []byte { return binary.BigEndian.AppendUint64(b, math.Float64bits(v)) }

func how(u *record.Used) byte {
	if u.Measured {
		return 1
	}
	return 0
}

// sum is empty where there was no line: nothing is no copy of nothing.
func (d *digest) sum() string {
	if d.lines == 0 {
		return ""
	}
	d.hash.Write(d.buf)
	return hex.EncodeToString(d.hash.Sum(nil))
}
