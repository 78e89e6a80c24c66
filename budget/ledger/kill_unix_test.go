//go:build linux || darwin

package ledger

import (
	"os"
	"os/exec"
	"os/signal"
	"syscall"
)

func init() { limitFiles = limitFilesUnix }

// limitFilesUnix makes writes beyond the limit fail; without ignoring the
// signal they would end the process.
func limitFilesUnix(most int64) error {
	signal.Ignore(syscall.SIGXFSZ)
	limit := syscall.Rlimit{Cur: uint64(most), Max: uint64(most)}
	return syscall.Setrlimit(syscall.RLIMIT_FSIZE, &limit)
}

// alone gives a process a group of its own.
func alone(cmd *exec.Cmd) { cmd.SysProcAttr = &syscall.SysProcAttr{Setpgid: true} }

// kill kills a process and, where it has a group of its own, what it started.
func kill(p *os.Process) error {
	if group, err := syscall.Getpgid(p.Pid); err == nil && group == p.Pid {
		return syscall.Kill(-p.Pid, syscall.SIGKILL)
	}
	return p.Kill()
}
