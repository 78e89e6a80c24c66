// Command gen writes the demo scenario: the carbon intensity of two grid zones
// and the records of a harbour authority's tide forecast. Everything in it is
// invented. It writes the same bytes each time; main_test.go holds the
// committed files against it.
//
// From the module's root:
//
//	go run ./testdata/demo/gen -out testdata/demo
package main

import (
	"bytes"
	"flag"
	"fmt"
	"hash/fnv"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"

	"github.com/klauspost/compress/gzip"
	"github.com/klauspost/compress/zstd"
)

//go:generate go run . -out ..

func main() {
	out := flag.String("out", "testdata/demo", "the demo's `folder`, with its policy")
	flag.Parse()
	if err := write(*out, *out); err != nil {
		fmt.Fprintln(os.Stderr, "gen:", err)
		os.Exit(1)
	}
}

// file is one file of the demo. What its name ends in tells how it is packed.
type file struct {
	name    string // below the demo's folder, with slashes
	content []byte // before packing
}

// write makes every file of the demo below dir, by the policy in demo.
func write(demo, dir string) error {
	policy, err := os.ReadFile(filepath.Join(demo, "budgetcheck.toml"))
	if err != nil {
		return err
	}
	files, err := scenario(policy)
	if err != nil {
		return err
	}
	for _, f := range files {
		packed, err := f.pack()
		if err != nil {
			return err
		}
		path := filepath.Join(dir, filepath.FromSlash(f.name))
		if err := os.MkdirAll(filepath.Dir(path), 0o755); err != nil {
			return err
		}
		if err := os.WriteFile(path, packed, 0o644); err != nil {
			return err
		}
	}
	return nil
}

// scenario is all files: two series, the base runs, the head runs, and the
// books of the winter before them.
func scenario(policy []byte) ([]file, error) {
	var files []file
	for _, z := range zones() {
		files = append(files, z.files()...)
	}
	books, err := winter(policy, files)
	if err != nil {
		return nil, err
	}
	files = append(files, books)
	for _, r := range append(baseRuns(), headRuns()...) {
		records, err := r.records()
		if err != nil {
			return nil, err
		}
		files = append(files, records...)
	}
	return files, nil
}

func (f file) pack() ([]byte, error) {
	switch {
	case strings.HasSuffix(f.name, ".gz"):
		return packGzip(f.content)
	case strings.HasSuffix(f.name, ".zst"):
		return packZstd(f.content)
	}
	return f.content, nil
}

// packGzip leaves the header's time and name empty: they would differ each time.
func packGzip(content []byte) ([]byte, error) {
	var packed bytes.Buffer
	z, err := gzip.NewWriterLevel(&packed, gzip.BestCompression)
	if err != nil {
		return nil, err
	}
	if _, err := z.Write(content); err != nil {
		return nil, err
	}
	if err := z.Close(); err != nil {
		return nil, err
	}
	return packed.Bytes(), nil
}

// packZstd keeps the window below the 8 MiB that every decoder supports.
func packZstd(content []byte) ([]byte, error) {
	const window = 1 << 20
	z, err := zstd.NewWriter(nil, zstd.WithEncoderConcurrency(1), zstd.WithWindowSize(window),
		zstd.WithEncoderLevel(zstd.SpeedBestCompression))
	if err != nil {
		return nil, err
	}
	return z.EncodeAll(content, nil), z.Close()
}

// seed was picked from a hundred: energy spreads by 2 % over the base runs,
// and the nights on the grid differ without deciding the demo.
const seed = 238

// stream is a source of chance for one thing. Each has its own, so that a
// change to one run leaves the files of all others as they are.
func stream(of string) *rand.Rand {
	h := fnv.New64a()
	h.Write([]byte(of))
	return rand.New(rand.NewPCG(seed, h.Sum64()))
}
