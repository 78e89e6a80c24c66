package ledger

import (
	"errors"
	"fmt"
	"os"

	"golang.org/x/sys/windows"
)

// Locks are mandatory here: one on the file's own bytes would keep readers out.
// So it lies where no byte ever will.
func nowhere() *windows.Overlapped { return &windows.Overlapped{OffsetHigh: 1 << 30} }

// tryLock takes the lock of an open file unless somebody holds it.
func tryLock(f *os.File, exclusive bool) (bool, error) {
	flags := uint32(windows.LOCKFILE_FAIL_IMMEDIATELY)
	if exclusive {
		flags |= windows.LOCKFILE_EXCLUSIVE_LOCK
	}
	err := windows.LockFileEx(windows.Handle(f.Fd()), flags, 0, 1, 0, nowhere())
	switch {
	case err == nil:
		return true, nil
	case errors.Is(err, windows.ERROR_LOCK_VIOLATION), errors.Is(err, windows.ERROR_IO_PENDING):
		return false, nil
	}
	return false, fmt.Errorf("lock %s: %w: %w", f.Name(), err, errNoLocks)
}

func unlock(f *os.File) error {
	return windows.UnlockFileEx(windows.Handle(f.Fd()), 0, 1, 0, nowhere())
}

// syncFolder does nothing: folders cannot be flushed here.
func syncFolder(string) error { return nil }
