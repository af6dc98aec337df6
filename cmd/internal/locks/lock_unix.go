//go:build unix

package locks

import (
	"errors"
	"io"
	"os"
	"sync"
	"syscall"
)

// take locks the file with flock(2), which the system undoes when the process ends, however it ends.
func take(path, doing string) (release func(), err error) {
	f, err := acquire(path, os.O_CREATE|os.O_RDWR, syscall.LOCK_EX)
	if err != nil {
		return nil, err
	}
	inscribe(f, doing)
	return sync.OnceFunc(func() { os.Remove(path); f.Close() }), nil
}

func takeShared(path string) (release func(), err error) {
	f, err := acquire(path, os.O_CREATE|os.O_RDWR, syscall.LOCK_SH)
	if err != nil {
		return nil, err
	}
	_ = f.Truncate(0) // nobody has the lock alone, so whoever is named in the file was killed
	return sync.OnceFunc(func() { f.Close() }), nil
}

// heldBy tries to have the lock, and gives it back at once.
func heldBy(path string) (Holder, bool) {
	f, err := acquire(path, os.O_RDWR, syscall.LOCK_EX)
	var held *Held
	if errors.As(err, &held) {
		return held.Holder, true
	}
	if err == nil {
		f.Close()
	}
	return Holder{}, false
}

// acquire opens the file that path names and locks it. Its holder may remove it between our opening and our locking, and
// what we are told of the lock then is not about the file that path names now.
func acquire(path string, flags, how int) (*os.File, error) {
	for {
		f, err := os.OpenFile(path, flags, 0o644)
		if err != nil {
			return nil, err
		}
		err = flock(f, how|syscall.LOCK_NB)
		refused := errors.Is(err, syscall.EWOULDBLOCK)
		switch {
		case (err == nil || refused) && !still(f, path):
			f.Close()
			continue
		case err == nil:
			return f, nil
		case refused:
			text, _ := io.ReadAll(io.LimitReader(f, longest))
			err = &Held{Path: path, Holder: holderIn(text)}
		}
		f.Close()
		return nil, err
	}
}

// flock locks an open file; a signal in between does not count.
func flock(f *os.File, how int) error {
	for {
		err := syscall.Flock(int(f.Fd()), how)
		switch {
		case errors.Is(err, syscall.EINTR):
			continue
		case errors.Is(err, syscall.ENOSYS), errors.Is(err, syscall.ENOTSUP), errors.Is(err, syscall.EOPNOTSUPP), errors.Is(err, syscall.ENOLCK):
			return &unlockable{f.Name(), err}
		}
		return err
	}
}

// still reports whether path is still the file that is open.
func still(f *os.File, path string) bool {
	ours, err := f.Stat()
	if err != nil {
		return false
	}
	there, err := os.Stat(path)
	return err == nil && os.SameFile(ours, there)
}

// unlockable is the error that a file system has no locks.
type unlockable struct {
	path string
	err  error
}

func (e *unlockable) Error() string { return e.path + ": this disk has no locks on files" }
func (e *unlockable) Hint() string {
	return "name a folder on another disk, or have this one attached with locks"
}
func (e *unlockable) Unwrap() error { return e.err }
