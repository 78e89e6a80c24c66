package ledger

import (
	"context"
	"errors"
	"fmt"
	"math/rand/v2"
	"os"
	"time"
)

// errNoLocks is wrapped where a file system has no locks.
var errNoLocks = errors.New("its file system has no locks")

// lock waits until it holds the lock of an open file, or ctx is done. The lock
// goes with the file's closing, also when the process is killed.
func lock(ctx context.Context, f *os.File, exclusive bool) error {
	wait := time.Millisecond / 2
	for {
		if got, err := tryLock(f, exclusive); got || err != nil {
			return err
		}
		if err := waitAbout(ctx, wait); err != nil {
			return fmt.Errorf("%s is in use by another process: %w", f.Name(), err)
		}
		const longest = 20 * time.Millisecond
		wait = min(wait*3/2, longest)
	}
}

// waitAbout waits about so long, at random from half of it to one and a half, so
// that those who collided do not meet again.
func waitAbout(ctx context.Context, about time.Duration) error {
	t := time.NewTimer(about/2 + rand.N(about))
	defer t.Stop()
	select {
	case <-ctx.Done():
		return ctx.Err()
	case <-t.C:
		return nil
	}
}
