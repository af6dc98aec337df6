//go:build !unix

package locks

import (
	"errors"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"sync"
)

// Without flock(2), a lock is held by an open file, where the system forbids to remove one (Windows does): a file that
// can be removed is left over from a killed process. Who shares a lock has a file of its own beside that of the lock.
// Each makes its own file first and then looks for those of others, so two that come at the same moment may both be
// refused, but never both be let in.

const sharing = ".shared-"

func take(path, doing string) (release func(), err error) {
	if err := cleared(path); err != nil {
		return nil, err
	}
	f, err := os.OpenFile(path, os.O_CREATE|os.O_EXCL|os.O_RDWR, 0o644)
	if errors.Is(err, fs.ErrExist) {
		return nil, &Held{Path: path, Holder: named(path)}
	}
	if err != nil {
		return nil, err
	}
	release = sync.OnceFunc(func() { f.Close(); os.Remove(path) })
	if err := noneShares(path); err != nil {
		release()
		return nil, err
	}
	inscribe(f, doing)
	return release, nil
}

func takeShared(path string) (release func(), err error) {
	f, err := os.CreateTemp(filepath.Dir(path), filepath.Base(path)+sharing+"*")
	if err != nil {
		return nil, err
	}
	release = sync.OnceFunc(func() { f.Close(); os.Remove(f.Name()) })
	if err := cleared(path); err != nil {
		release()
		return nil, err
	}
	return release, nil
}

func heldBy(path string) (Holder, bool) {
	err := cleared(path)
	if err == nil {
		err = noneShares(path)
	}
	var held *Held
	if !errors.As(err, &held) {
		return Holder{}, false
	}
	return held.Holder, true
}

// cleared removes a lock's file that nobody holds; the error says who does.
func cleared(path string) error {
	if err := os.Remove(path); err == nil || errors.Is(err, fs.ErrNotExist) {
		return nil
	}
	return &Held{Path: path, Holder: named(path)}
}

// noneShares removes the files of those that shared the lock and were killed; the error says that one still has it.
func noneShares(path string) error {
	entries, err := os.ReadDir(filepath.Dir(path))
	if err != nil {
		return err
	}
	for _, e := range entries {
		if !strings.HasPrefix(e.Name(), filepath.Base(path)+sharing) {
			continue
		}
		if cleared(filepath.Join(filepath.Dir(path), e.Name())) != nil {
			return &Held{Path: path}
		}
	}
	return nil
}

// named reads who has the lock.
func named(path string) Holder {
	f, err := os.Open(path)
	if err != nil {
		return Holder{}
	}
	defer f.Close()
	text, _ := io.ReadAll(io.LimitReader(f, longest))
	return holderIn(text)
}
