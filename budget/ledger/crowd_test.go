package ledger

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"math/rand/v2"
	"os"
	"os/exec"
	"strconv"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// clerk is the environment variable that turns the test binary into a process
// that books into the ledger it names, and does nothing else.
const clerk = "BUDGETCHECK_TEST_CLERK"

func TestMain(m *testing.M) {
	if work := os.Getenv(clerk); work != "" {
		if err := clerkAt(work); err != nil {
			fmt.Fprintln(os.Stderr, err)
			os.Exit(1)
		}
		return
	}
	os.Exit(m.Run())
}

// clerkAt books `runs` one-hour runs of a name, `batch` at a time, and prints
// each run when it is confirmed. work is "NAME RUNS BATCH URL".
func clerkAt(work string) error {
	if limit, err := strconv.ParseInt(os.Getenv(fileLimit), 10, 64); err == nil {
		if err := limitFiles(limit); err != nil {
			return err
		}
	}
	words := strings.SplitN(work, " ", 4)
	runs, _ := strconv.Atoi(words[1])
	batch, _ := strconv.Atoi(words[2])
	s, err := Open(ctx, words[3])
	if err != nil {
		return err
	}
	list := entries(words[0], runs)
	for n := 0; n < runs; n += batch {
		some := list[n:min(n+batch, runs)]
		answers, err := s.Book(ctx, some, nil)
		if err != nil {
			return err
		}
		for i, e := range some {
			fmt.Println(e.Run.Run, answers[i])
		}
	}
	return s.Close()
}

// clerkBooking is such a process, not yet started, in a folder of its own.
func clerkBooking(t *testing.T, url, name string, runs, batch int) *exec.Cmd {
	t.Helper()
	program, err := os.Executable()
	require.NoError(t, err)
	cmd := exec.Command(program)
	cmd.Dir = t.TempDir()
	cmd.Env = append(os.Environ(), fmt.Sprintf("%s=%s %d %d %s", clerk, name, runs, batch, url))
	cmd.Stderr = os.Stderr
	return cmd
}

// fileLimit is the environment variable that keeps a clerk's files from growing
// beyond so many bytes, as a full disk would.
const fileLimit = "BUDGETCHECK_TEST_FILE_LIMIT"

var limitFiles = func(int64) error { return errors.ErrUnsupported }

// crowd lets many processes book at once: everything must be in, once.
func crowd(t *testing.T, url string, processes, runs, batch int, env ...func(n int) string) {
	t.Helper()
	var all []*exec.Cmd
	for n := range processes {
		cmd := clerkBooking(t, url, fmt.Sprint("clerk", n), runs, batch)
		for _, more := range env {
			cmd.Env = append(cmd.Env, more(n))
		}
		require.NoError(t, cmd.Start())
		all = append(all, cmd)
	}
	for _, cmd := range all {
		assert.NoError(t, cmd.Wait())
	}
	s, err := Open(ctx, url)
	require.NoError(t, err)
	b := read(t, s, Query{})
	assert.Len(t, b.Entries, processes*runs)
	seen := map[string]bool{}
	for _, e := range b.Entries {
		assert.False(t, seen[e.Run.Run], "%s is there twice", e.Run.Run)
		seen[e.Run.Run] = true
	}
	for n := range processes {
		for i := range runs {
			assert.True(t, seen[fmt.Sprint("clerk", n, "-", i)], "run %d of clerk %d is lost", i, n)
		}
	}
	sound(t, s)
	require.NoError(t, s.Close())
}

// confirmed reads what a clerk printed: the runs that it was told are booked.
func confirmed(out string) (runs []string) {
	lines := bufio.NewScanner(strings.NewReader(out))
	for lines.Scan() {
		if run, _, whole := strings.Cut(lines.Text(), " "); whole {
			runs = append(runs, run)
		}
	}
	return runs
}

// shoot kills a clerk some time after it has started, at most `most` after it
// was first told that something is booked, and gives what it was told.
func shoot(t *testing.T, cmd *exec.Cmd, most time.Duration) []string {
	t.Helper()
	pipe, err := cmd.StdoutPipe()
	if !assert.NoError(t, err) || !assert.NoError(t, cmd.Start()) {
		return nil
	}
	told := bufio.NewReader(pipe)
	first := ""
	if rand.N(4) > 0 {
		first, err = told.ReadString('\n')
		assert.NoError(t, err)
	}
	time.Sleep(rand.N(most))
	assert.NoError(t, kill(cmd.Process))
	rest, err := io.ReadAll(told)
	assert.NoError(t, err)
	assert.Error(t, cmd.Wait())
	return confirmed(first + string(rest))
}

// shootAll kills so many clerks, four of them at work at once.
func shootAll(t *testing.T, kills int, most time.Duration, clerk func(n int) *exec.Cmd) [][]string {
	t.Helper()
	told := make([][]string, kills)
	const together = 4
	var wait sync.WaitGroup
	for first := range together {
		wait.Go(func() {
			for n := first; n < kills; n += together {
				told[n] = shoot(t, clerk(n), most)
			}
		})
	}
	wait.Wait()
	return told
}

// survive checks a ledger whose clerks were killed: it can be read, everything
// that was confirmed is there, nothing is there twice, and booking goes on.
func survive(t *testing.T, url string, told [][]string) {
	t.Helper()
	s, err := Open(ctx, url)
	require.NoError(t, err)
	assert.Equal(t, []Answer{Booked}, book(t, s, entry("after")))
	there, total := map[string]bool{}, 0
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
	t.Logf("%d processes killed, %d bookings confirmed, %d there", len(told), total, len(there)-1)
	assert.Positive(t, total)
	sound(t, s)
}
