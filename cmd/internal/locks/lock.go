// Package locks has advisory locks between processes. A lock dies with its process: what a killed run held is free at
// once, and nobody has to clear it away.
//
// A lock is a file of its own beside what it guards. The file says who holds the lock, for the message to whoever is
// refused; whether it is held is known to the system alone, so the file of a killed process is no hindrance. Who takes
// a lock must keep its release: a lock whose release is forgotten ends with it.
package locks

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"time"
)

// Holder is the process that has a lock, as it says itself in the lock's file. It is zero where that is not known: a
// shared lock names nobody, and one that was taken this moment may not have named its holder yet.
type Holder struct {
	PID   int       `json:"pid"`
	Host  string    `json:"host"`
	Doing string    `json:"doing"`
	Since time.Time `json:"since"`
}

// Held is the error that somebody else holds a lock.
type Held struct {
	Path   string // of the lock's file
	Holder Holder
}

// Error says what is held, by whom, and what for.
func (e *Held) Error() string {
	h, by, about := e.Holder, "", []string{}
	if h.PID > 0 {
		by = fmt.Sprintf(" (process %d)", h.PID)
		if h.Host != "" {
			by = fmt.Sprintf(" (process %d on host %s)", h.PID, h.Host)
		}
	}
	if h.Doing != "" {
		about = append(about, h.Doing)
	}
	if !h.Since.IsZero() {
		about = append(about, "since "+h.Since.Local().Format(time.DateTime))
	}
	text := fmt.Sprintf("another drumlin%s holds %s", by, filepath.ToSlash(e.Path))
	if len(about) > 0 {
		text += ": " + strings.Join(about, ", ")
	}
	return text
}

// Hint says what to do.
func (e *Held) Hint() string { return "wait until it has ended" }

// Wait tries again after a pause. A refusal is looked at again after moments before it is told: the holder may be about
// to name itself, or have held the lock only to see whether it is free.
const (
	pause   = 200 * time.Millisecond
	moment  = 2 * time.Millisecond
	moments = 3
)

// Take takes a lock for one process alone and never waits for it, a few milliseconds aside: the error is a *Held if
// somebody else has it, shared or alone. doing says what for, such as "the gathering". The lock's folder must be there.
// release gives the lock back and removes its file; it may be called more than once.
func Take(path, doing string) (release func(), err error) {
	return persist(func() (func(), error) { return take(path, doing) })
}

// TakeShared takes a lock that several may hold together, but none beside one that Take has given. It never waits, a
// few milliseconds aside: the error is a *Held if somebody has the lock alone. release may be called more than once.
//
// Nobody can tell without doubt that it is the last one to share a lock, so on Unix its file stays, empty, until Take
// has had it.
func TakeShared(path string) (release func(), err error) {
	return persist(func() (func(), error) { return takeShared(path) })
}

// Wait is Take for who has time: it tries again every 200 ms until ctx is done, and then returns the error of ctx.
// waiting, unless it is nil, is called once, when the lock is not free at first, with who holds it.
func Wait(ctx context.Context, path, doing string, waiting func(Holder)) (release func(), err error) {
	for {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		release, err := Take(path, doing)
		var held *Held
		if !errors.As(err, &held) {
			return release, err
		}
		if waiting != nil {
			waiting(held.Holder)
			waiting = nil
		}
		select {
		case <-ctx.Done():
		case <-time.After(pause):
		}
	}
}

// HeldBy reports whether somebody holds a lock, and who. It makes no file. A lock that it has no right to look at counts
// as free.
func HeldBy(path string) (Holder, bool) { return heldBy(path) }

// persist looks at a refusal more than once.
func persist(attempt func() (func(), error)) (release func(), err error) {
	for n := 1; ; n++ {
		release, err = attempt()
		var held *Held
		if n == moments || !errors.As(err, &held) {
			return release, err
		}
		time.Sleep(moment)
	}
}

// inscribe writes who has the lock into its file. The lock holds without it, so a full disk is left for those to tell
// who write something that counts.
func inscribe(f *os.File, doing string) {
	host, _ := os.Hostname() // unknown where it cannot be had
	line, err := json.Marshal(Holder{PID: os.Getpid(), Host: host, Doing: doing, Since: time.Now().UTC().Truncate(time.Second)})
	length := 0
	if err == nil {
		length, err = f.WriteAt(append(line, '\n'), 0)
	}
	if err != nil {
		length = 0
	}
	_ = f.Truncate(int64(length)) // cuts off what a killed process had written
}

// longest bounds the text that is read from a lock's file, in bytes.
const longest = 1 << 16

// holderIn reads who has the lock from the first line of its file; zero where that is no such line.
func holderIn(text []byte) Holder {
	line, _, whole := bytes.Cut(text, []byte("\n"))
	var h Holder
	if !whole || json.Unmarshal(line, &h) != nil || h.PID <= 0 {
		return Holder{}
	}
	return h
}
