package record

import (
	"bytes"
	"errors"
	"fmt"
	"io"

	"github.com/klauspost/compress/gzip"
	"github.com/klauspost/compress/zstd"
)

// maxWindow bounds what a zstd stream may ask of memory; levels up to 19 stay
// within it (RFC 8878, 3.1.1.1.2, recommends that decoders support 8 MiB).
const maxWindow = 8 << 20

// inflate looks at the first bytes and decompresses what is compressed. A
// stream cut short, also within its header, reads as io.ErrUnexpectedEOF.
func inflate(r io.Reader) (io.Reader, io.Closer, error) {
	var magic [4]byte
	n, err := io.ReadFull(r, magic[:])
	if err != nil && n == 0 && err != io.EOF {
		return nil, nil, err
	}
	whole := io.MultiReader(bytes.NewReader(magic[:n]), r)
	switch {
	case bytes.HasPrefix(magic[:n], []byte{0x1f, 0x8b}):
		z, err := gzip.NewReader(whole)
		if errors.Is(err, io.EOF) || errors.Is(err, io.ErrUnexpectedEOF) {
			return cut{}, nil, nil
		}
		return z, z, err
	case bytes.HasPrefix(magic[:n], []byte{0x28, 0xb5, 0x2f, 0xfd}):
		z, err := zstd.NewReader(whole, zstd.WithDecoderConcurrency(1), zstd.WithDecoderLowmem(true), zstd.WithDecoderMaxWindow(maxWindow))
		if err != nil {
			return nil, nil, err
		}
		c := z.IOReadCloser()
		return c, c, nil
	}
	return whole, nil, nil
}

// cut is a stream that ends within its header.
type cut struct{}

func (cut) Read([]byte) (int, error) { return 0, io.ErrUnexpectedEOF }

// unreadable is the failure to decompress the record called name.
func unreadable(name string, err error) error {
	return fmt.Errorf("%s: the compressed record cannot be read (%w); compress the record again, zstd at level 19 or less", name, err)
}
