//go:build !windows

package ledger

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// traffic counts what goes to and fro between a clone and its remote.
type traffic struct {
	t                 testing.TB
	down, up, tracing string // files
}

// tap puts a tap into both lines of a clone.
func tap(t testing.TB, c folder) traffic {
	t.Helper()
	dir := t.TempDir()
	f := traffic{t, filepath.Join(dir, "down"), filepath.Join(dir, "up"), filepath.Join(dir, "trace")}
	script := func(name, text string) string {
		path := filepath.Join(dir, name)
		require.NoError(t, os.WriteFile(path, []byte("#!/bin/sh\n"+text+"\n"), 0o777))
		return path
	}
	c.git("config", "remote.origin.uploadpack", script("upload", `git-upload-pack "$@" | tee -a '`+f.down+`'`))
	c.git("config", "remote.origin.receivepack", script("receive", `tee -a '`+f.up+`' | git-receive-pack "$@"`))
	t.Setenv("GIT_TRACE2_PERF", f.tracing)
	return f
}

// flow is what went since it was asked last.
type flow struct {
	fetches, pushes int
	down, up        int // bytes
}

func (f traffic) flow() (since flow) {
	f.t.Helper()
	trace, err := os.ReadFile(f.tracing)
	require.NoError(f.t, err)
	for l := range strings.Lines(string(trace)) {
		switch own := strings.Contains(l, "| d0 |") && strings.Contains(l, "| cmd_name "); {
		case own && strings.Contains(l, "| fetch "):
			since.fetches++
		case own && strings.Contains(l, "| push "):
			since.pushes++
		}
	}
	size := func(name string) int {
		text, err := os.ReadFile(name)
		if !os.IsNotExist(err) {
			require.NoError(f.t, err)
		}
		return len(text)
	}
	since.down, since.up = size(f.down), size(f.up)
	for _, name := range []string{f.tracing, f.down, f.up} {
		require.NoError(f.t, os.RemoveAll(name))
	}
	return since
}

// years fills a server's ledger with entries of one-hour runs, evenly over
// months, as one commit.
func years(t testing.TB, server folder, months, each int) {
	t.Helper()
	s := openGitAt(t, t.TempDir(), server.url()+"#ledger")
	for m := range months {
		book(t, s, monthly(m, each)...)
	}
}

// monthly are entries of the m-th month of 730 hours.
func monthly(m, each int) (list []*Entry) {
	for i := range each {
		start := 730*float64(m) + 700*float64(i)/float64(each)
		list = append(list, entry(fmt.Sprint("m", m, "-", i), lasting(start, 1)))
	}
	return list
}

// TestGitRequests: a booking asks the server twice and tells it once where
// nothing is at hand, and asks once where the last state is, also when others
// have booked since. Files of other months do not come along.
func TestGitRequests(t *testing.T) {
	cached(t)
	server := newServer(t)
	months, each := 3, 200
	years(t, server, months, each)
	c := server.clone("--depth=1", "--no-checkout", "--filter=tree:0", "--branch=ledger")
	f := tap(t, c)
	s := openGitAt(t, c.dir, "ledger")
	latest := 730*float64(months-1) + 48
	book(t, s, entry("r1", lasting(latest, 1)))
	first := f.flow()
	assert.Equal(t, flow{2, 1, first.down, first.up}, first)
	book(t, s, entry("r2", lasting(latest+1, 1)))
	second := f.flow()
	assert.Equal(t, flow{1, 1, second.down, second.up}, second)
	book(t, openGitAt(t, t.TempDir(), server.url()+"#ledger"), entry("other", lasting(latest+2, 1)))
	f.flow()
	book(t, s, entry("r3", lasting(latest+3, 1)))
	third := f.flow()
	assert.Equal(t, flow{1, 1, third.down, third.up}, third)
	t.Logf("first booking %+v, with the last state at hand %+v, after another's %+v", first, second, third)

	size := len(server.git("show", "ledger:2031-05.ndjson"))
	assert.Less(t, third.down, size/10, "what others booked comes as a difference")
	assert.Less(t, third.up, size/10, "and so goes what is booked")
	b := read(t, s, Query{Since: hours(latest)})
	assert.Greater(t, len(b.Entries), each/2)
	assert.Equal(t, 1, f.flow().fetches)
	held := strings.Count(server.heldIn(s.home), "blob")
	assert.Positive(t, held)
	read(t, s, Query{})
	assert.Equal(t, 2, f.flow().fetches, "all other months come with one request")
	assert.Equal(t, []Answer{Already}, book(t, s, entry("m0-0", lasting(0, 1))))
	assert.Equal(t, flow{fetches: 1}, f.flow().requests(), "nothing is pushed where nothing is new")
}

func (f flow) requests() flow { return flow{fetches: f.fetches, pushes: f.pushes} }

// heldIn lists the objects that are at hand in one of our repositories.
func (r folder) heldIn(dir string) string {
	return folder{r.t, dir}.git("cat-file", "--batch-all-objects", "--batch-check")
}

// TestGitReadsMonths: only the files of the months that may matter are fetched.
func TestGitReadsMonths(t *testing.T) {
	slow(t)
	cached(t)
	server := newServer(t)
	const month = 31 * 24 // so long, and runs a day after, that each has its own
	first := openGitAt(t, t.TempDir(), server.url()+"#ledger")
	for m := range 4 {
		book(t, first, entry(fmt.Sprint("r", m), lasting(float64(month*m+24), 1)))
	}
	require.NoError(t, os.RemoveAll(first.home))
	s := openGitAt(t, t.TempDir(), server.url()+"#ledger")
	for _, c := range []struct{ from, months int }{{3, 1}, {2, 2}, {0, 4}} {
		assert.Len(t, read(t, s, Query{Since: hours(float64(month*c.from + 24))}).Entries, c.months)
		assert.Equal(t, c.months, strings.Count(server.heldIn(s.home), "blob"))
	}
}

// BenchmarkGitBook books single runs into a ledger of 100,000 entries over 36
// months: first with nothing at hand, then with the last state.
func BenchmarkGitBook(b *testing.B) {
	cached(b)
	server := newServer(b)
	const months, each = 36, 2778
	years(b, server, months, each)
	b.Run("nothing at hand", func(b *testing.B) { benchBook(b, server, months, true) })
	b.Run("last state at hand", func(b *testing.B) { benchBook(b, server, months, false) })
}

func benchBook(b *testing.B, server folder, months int, afresh bool) {
	c := server.clone("--depth=1", "--no-checkout", "--filter=tree:0", "--branch=ledger")
	s := openGitAt(b, c.dir, "ledger")
	latest := 730 * float64(months-1)
	book(b, s, entry(b.Name(), lasting(latest, 1)))
	f := tap(b, c)
	s = openGitAt(b, c.dir, "ledger")
	f.flow()
	var sum flow
	n := 0
	for b.Loop() {
		if afresh {
			require.NoError(b, os.RemoveAll(s.home))
		}
		n++
		book(b, s, entry(fmt.Sprint(b.Name(), b.N, "-", n), lasting(latest+float64(n)/100, 1)))
	}
	sum = f.flow()
	b.ReportMetric(float64(sum.fetches)/float64(n), "fetches/op")
	b.ReportMetric(float64(sum.pushes)/float64(n), "pushes/op")
	b.ReportMetric(float64(sum.down)/float64(n), "bytes-down/op")
	b.ReportMetric(float64(sum.up)/float64(n), "bytes-up/op")
}
