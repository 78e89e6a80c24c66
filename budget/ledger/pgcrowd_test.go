//go:build unix

package ledger

import (
	"bufio"
	"fmt"
	"io"
	"math/rand/v2"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// TestPostgresCrowd: 32 processes that book at once lose nothing, and the sums
// are those of the entries.
func TestPostgresCrowd(t *testing.T) {
	if testing.Short() {
		t.Skip("takes a minute")
	}
	url := freshDatabase(t)
	crowd(t, url, 32, 50, 1)
	s := opened(t, url)
	b := read(t, s, Query{})
	for n := range 4 {
		w := Window{Account: "main", From: hours(0.25 * float64(n)), To: hours(20.5 * float64(n))}
		want, got := b.Spent(w), spentBy(t, s, w)
		require.Len(t, got.Lines, len(want.Lines))
		for i := range want.Lines {
			equalSpent(t, want.Lines[i], got.Lines[i])
		}
	}
}

// TestPostgresKilled: processes are killed at random points of their bookings,
// 200 times. All that they were told is booked is there, nothing is there
// twice, and the tables agree.
func TestPostgresKilled(t *testing.T) {
	if testing.Short() {
		t.Skip("takes half a minute")
	}
	const kills, together = 200, 4
	url := freshDatabase(t)
	s := opened(t, url)
	told := make([][]string, kills)
	for n := 0; n < kills; n += together {
		var wait sync.WaitGroup
		for i := n; i < min(n+together, kills); i++ {
			wait.Go(func() { told[i] = killed(t, url, fmt.Sprint("clerk", i)) })
		}
		wait.Wait()
		read(t, s, Query{Last: 1})
	}
	total := 0
	there := map[string]bool{}
	for _, e := range read(t, s, Query{}).Entries {
		assert.False(t, there[e.Run.Run], "%s is there twice", e.Run.Run)
		there[e.Run.Run] = true
	}
	for _, runs := range told {
		total += len(runs)
		for _, run := range runs {
			assert.True(t, there[run], "%s was confirmed and is not there", run)
		}
	}
	t.Logf("%d kills, %d bookings confirmed, %d there", kills, total, len(there))
	assert.Positive(t, total)
	sound(t, s)
}

// killed books until the process is killed, some time before or after it was
// told of a first, second, ... booking, and gives the runs that it was told of.
func killed(t *testing.T, url, name string) []string {
	const plenty = 1_000 // more than it will manage
	cmd := clerkBooking(t, url, name, plenty, 1)
	pipe, err := cmd.StdoutPipe()
	require.NoError(t, err)
	require.NoError(t, cmd.Start())
	var out strings.Builder
	told := bufio.NewReader(pipe)
	for range rand.N(5) {
		line, err := told.ReadString('\n')
		assert.NoError(t, err)
		out.WriteString(line)
	}
	time.Sleep(rand.N(20 * time.Millisecond))
	assert.NoError(t, cmd.Process.Kill())
	rest, err := io.ReadAll(told)
	assert.NoError(t, err)
	out.Write(rest)
	assert.ErrorContains(t, cmd.Wait(), "killed")
	return confirmed(out.String())
}
