//go:build unix

package pipeline

import (
	"errors"
	"os"
	"strings"
	"syscall"
)

// lock takes an advisory lock, a file called as the output with .partial.lock after it, that dies with the process.
func lock(path string) (release func(), err error) {
	for {
		f, err := os.OpenFile(path, os.O_CREATE|os.O_RDWR, 0o644)
		if err != nil {
			return nil, plainly(err, path)
		}
		if err := syscall.Flock(int(f.Fd()), syscall.LOCK_EX|syscall.LOCK_NB); err != nil {
			f.Close()
			if errors.Is(err, syscall.EWOULDBLOCK) {
				return nil, refuse("wait for it, or name another output", "another drumlin is writing %s", strings.TrimSuffix(path, ".partial.lock"))
			}
			return nil, err
		}
		if still(f, path) {
			return func() { os.Remove(path); f.Close() }, nil
		}
		f.Close() // its holder removed it between our opening and our locking
	}
}

// still reports whether path is still the file that was locked.
func still(f *os.File, path string) bool {
	ours, err := f.Stat()
	if err != nil {
		return false
	}
	there, err := os.Stat(path)
	return err == nil && os.SameFile(ours, there)
}
