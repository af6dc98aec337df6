//go:build !unix

package pipeline

import (
	"os"
	"strings"
)

// lock takes a lock that an open file holds where the system forbids to remove open files.
func lock(path string) (release func(), err error) {
	os.Remove(path) // left over from a killed run
	f, err := os.OpenFile(path, os.O_CREATE|os.O_EXCL|os.O_RDWR, 0o644)
	if err != nil {
		return nil, refuse("wait for it, or name another output", "another drumlin is writing %s", strings.TrimSuffix(path, ".partial.lock"))
	}
	return func() { f.Close(); os.Remove(path) }, nil
}
