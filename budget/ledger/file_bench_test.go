package ledger

import (
	"bufio"
	"bytes"
	"fmt"
	"os"
	"path/filepath"
	"testing"

	"github.com/stretchr/testify/require"
)

// BenchmarkFileMonth reads and adds up the month so far of a file of 1,000,000
// entries over three years, and books one run into it.
func BenchmarkFileMonth(b *testing.B) {
	const all, years = 1_000_000, 3.0
	path := filepath.Join(b.TempDir(), "books")
	size := writeMany(b, path, all, years*365*24/all)
	s := openBooks(b, path)
	month := years*365*24 - 730
	b.Run("month to date", func(b *testing.B) {
		n := 0
		for b.Loop() {
			books := read(b, s, Query{Accounts: []string{"main"}, Since: hours(month)})
			books.Spent(Window{Account: "main", From: hours(month), To: hours(month + 744)})
			n = len(books.Entries)
		}
		b.ReportMetric(float64(n), "entries")
		b.ReportMetric(float64(n)*float64(size)/all/1e6, "MB-of-lines")
	})
	b.Run("one account in ten", func(b *testing.B) {
		for b.Loop() {
			read(b, s, Query{Accounts: []string{"pull/7"}, Since: hours(month)})
		}
	})
	b.Run("book", func(b *testing.B) {
		for n := 0; b.Loop(); n++ {
			book(b, s, entry(fmt.Sprint(b.N, "-", n), lasting(years*365*24, 1)))
		}
	})
}

// writeMany writes entries of one-hour runs, one every so many hours: copies of
// one line with other names and times.
func writeMany(b *testing.B, path string, n int, every float64) (size int64) {
	b.Helper()
	f, err := os.Create(path)
	require.NoError(b, err)
	w := bufio.NewWriterSize(f, 1<<20)
	e := entry("RUN", lasting(0, 1))
	form := bytes.TrimSuffix(line{entry: e}.append(nil), []byte("\n"))
	for i := range n {
		start := float64(i) * every
		text := bytes.ReplaceAll(form, []byte("RUN"), fmt.Appendf(nil, "run-%d", i))
		for _, at := range []float64{0, 1} {
			text = bytes.ReplaceAll(text, []byte(hours(at).String()), []byte(hours(start+at).String()))
		}
		text = bytes.ReplaceAll(text, []byte(e.BookedAt.String()), []byte(hours(start+1).String()))
		_, err := w.Write(append(text, '\n'))
		require.NoError(b, err)
	}
	require.NoError(b, w.Flush())
	require.NoError(b, f.Sync()) // not at the first booking's expense
	info, err := f.Stat()
	require.NoError(b, err)
	require.NoError(b, f.Close())
	return info.Size()
}
