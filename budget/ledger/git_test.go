package ledger

import (
	"fmt"
	"os/exec"
	"testing"
	"time"
)

// TestGit: a branch of a server, without a clone.
func TestGit(t *testing.T) {
	slow(t)
	cached(t)
	servers := map[string]folder{}
	some(t, func(t *testing.T) Store {
		if _, known := servers[t.Name()]; !known {
			servers[t.Name()] = newServer(t)
		}
		return openGitAt(t, t.TempDir(), servers[t.Name()].url()+"#books/ledger")
	})
}

// TestGitLocal: a branch of the clone's own.
func TestGitLocal(t *testing.T) {
	clones := map[string]folder{}
	some(t, func(t *testing.T) Store {
		if _, known := clones[t.Name()]; !known {
			clones[t.Name()] = newClone(t)
		}
		return openGitAt(t, clones[t.Name()].dir, "budgetcheck-ledger")
	})
}

// some is the whole suite, or the part of it that a store of many processes can
// pass quickly.
func some(t *testing.T, open func(*testing.T) Store) {
	if !testing.Short() {
		suite(t, open)
		return
	}
	t.Run("booking", func(t *testing.T) { suiteBooking(t, open) })
}

// TestGitCrowd: 32 processes on several machines that book at once lose nothing
// and double nothing.
func TestGitCrowd(t *testing.T) {
	slow(t)
	const processes, runs, batch = 32, 50, 25
	const machines = 2
	var caches []string
	for range machines {
		caches = append(caches, t.TempDir())
	}
	cached(t)
	machine := func(n int) string { return "XDG_CACHE_HOME=" + caches[n%machines] }
	crowd(t, "git:"+newServer(t).url()+"#ledger", processes, runs, batch, machine)
}

// TestGitKilled: processes are killed at random points of their bookings, half
// of them with the gits that they started.
func TestGitKilled(t *testing.T) {
	slow(t)
	const kills = 200
	cached(t)
	url := "git:" + newServer(t).url() + "#ledger"
	survive(t, url, shootAll(t, kills, 200*time.Millisecond, func(n int) *exec.Cmd {
		cmd := clerkBooking(t, url, fmt.Sprint("clerk", n), 300, 3)
		if n%2 == 0 {
			alone(cmd)
		}
		return cmd
	}))
}
