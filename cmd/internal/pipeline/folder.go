package pipeline

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"syscall"

	"drumlin/cmd/internal/locks"
)

// Folder makes dir whole or not at all: fill writes into a sibling dir.partial, which is renamed at the end with
// everything on the disk. An error, a cancelled ctx and a full disk leave neither dir.partial nor a parent folder that
// was made for it; what a killed process left behind is cleared by the next one. An existing dir is refused without
// force, and with force only a folder that drumlin wrote is replaced.
func Folder(ctx context.Context, dir string, force bool, fill func(partial string) error) (err error) {
	return folder(ctx, dir, force, atOnce, fill)
}

func atOnce(wait func() error) error { return wait() }

// folder is Folder with what waits for the disk given to waiting.
func folder(ctx context.Context, dir string, force bool, waiting func(wait func() error) error, fill func(partial string) error) (err error) {
	dir = filepath.Clean(dir)
	if err := checkFolder(dir, force); err != nil {
		return err
	}
	made, err := makeParents(dir)
	defer func() {
		if err != nil {
			unmake(made)
		}
	}()
	if err != nil {
		return err
	}
	partial := dir + ".partial"
	release, err := claim(partial)
	if err != nil {
		return err
	}
	defer func() {
		if err != nil {
			err = errors.Join(err, os.RemoveAll(partial))
		}
		release()
	}()
	if err := bringBack(dir, force); err != nil {
		return err
	}
	if err := fill(partial); err != nil {
		return err
	}
	if err := ctx.Err(); err != nil {
		return err
	}
	return waiting(func() error {
		if err := syncAll(partial); err != nil {
			return err
		}
		return replace(partial, dir)
	})
}

// checkFolder refuses an existing folder early, before any work.
func checkFolder(dir string, force bool) error {
	info, err := os.Lstat(dir)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return nil
	case err != nil:
		return Plainly(err, dir)
	case !force:
		return refuse("name another folder, or add --force to replace it", "%s exists already", dir)
	case !info.IsDir():
		return refuse("name another folder", "%s is not a folder, so it is not replaced", dir)
	}
	entries, err := os.ReadDir(dir)
	if err != nil {
		return Plainly(err, dir)
	}
	if len(entries) > 0 && !isOurs(dir) {
		return refuse("name another folder, or empty it yourself", "%s holds files that drumlin did not write, so it is not replaced", dir)
	}
	return nil
}

// isOurs reports whether a folder is the result of an earlier run.
func isOurs(dir string) bool {
	for _, mark := range []string{"summary.json", "commands.txt"} {
		if info, err := os.Stat(filepath.Join(dir, mark)); err == nil && info.Mode().IsRegular() {
			return true
		}
	}
	return false
}

// makeParents makes the folders that dir is to stand in and returns those that were not there, the outermost first,
// also beside an error.
func makeParents(dir string) (made []string, err error) {
	var missing []string
	for p := filepath.Dir(dir); ; p = filepath.Dir(p) {
		if _, err := os.Stat(p); !errors.Is(err, fs.ErrNotExist) || p == filepath.Dir(p) {
			break
		}
		missing = append(missing, p)
	}
	for _, p := range slices.Backward(missing) {
		if err := os.Mkdir(p, 0o755); err == nil {
			made = append(made, p)
		} else if !errors.Is(err, fs.ErrExist) { // another process may have been quicker
			return made, Plainly(err, p)
		}
	}
	return made, nil
}

// MakeFolder makes an empty folder, and those it is to stand in.
func MakeFolder(dir string) error {
	made, err := makeParents(filepath.Join(dir, "any"))
	if err != nil {
		unmake(made)
	}
	return err
}

// unmake removes the folders again in which nothing stands.
func unmake(made []string) {
	for _, p := range slices.Backward(made) {
		os.Remove(p)
	}
}

// claim makes an empty folder partial that no other process works in. The lock dies with its process, so a folder
// without one is left over from a killed run.
func claim(partial string) (release func(), err error) {
	release, err = lock(partial + ".lock")
	if err != nil {
		return nil, err
	}
	if err = os.RemoveAll(partial); err == nil {
		err = os.Mkdir(partial, 0o755)
	}
	if err != nil {
		release()
		return nil, Plainly(err, filepath.Dir(partial))
	}
	return release, nil
}

// lock takes the lock of an output that is being written, a file called as the output with .partial.lock after it.
func lock(path string) (release func(), err error) {
	output := strings.TrimSuffix(path, ".partial.lock")
	release, err = locks.Take(path, "writing "+filepath.Base(output))
	var held *locks.Held
	switch {
	case errors.As(err, &held):
		return nil, refuse("wait for it, or name another output", "another drumlin is writing %s", output)
	case err != nil:
		return nil, Plainly(err, path)
	}
	return release, nil
}

// replace puts partial in the place of dir, and an old dir out of the way first.
func replace(partial, dir string) error {
	old := dir + replacedSuffix
	if err := os.RemoveAll(old); err != nil {
		return err
	}
	err := os.Rename(dir, old)
	if err != nil && !errors.Is(err, fs.ErrNotExist) {
		return err
	}
	if err := os.Rename(partial, dir); err != nil {
		return errors.Join(Plainly(err, dir), restore(old, dir))
	}
	if err := sync(filepath.Dir(dir)); err != nil {
		return err
	}
	return os.RemoveAll(old)
}

// ClearUp removes what a killed run has left beside a folder that it had finished.
func ClearUp(dir string) error {
	left := false
	for _, name := range []string{dir + ".partial", dir + ".partial.lock", dir + replacedSuffix} {
		if _, err := os.Lstat(name); err == nil {
			left = true
		}
	}
	if !left {
		return nil
	}
	release, err := lock(dir + ".partial.lock")
	if err != nil {
		return err
	}
	defer release()
	return errors.Join(os.RemoveAll(dir+".partial"), os.RemoveAll(dir+replacedSuffix))
}

// bringBack undoes a replacement that a kill cut short between its two renames: the old folder is put back, and then
// counts as any other that is there.
func bringBack(dir string, force bool) error {
	if _, err := os.Lstat(dir); !errors.Is(err, fs.ErrNotExist) {
		return nil
	}
	if err := restore(dir+replacedSuffix, dir); err != nil {
		return Plainly(err, dir)
	}
	return checkFolder(dir, force)
}

// replacedSuffix marks an old folder that is out of the way until the new one is in place.
const replacedSuffix = ".replaced"

// restore puts an old folder back, if there is one.
func restore(old, dir string) error {
	if err := os.Rename(old, dir); !errors.Is(err, fs.ErrNotExist) {
		return err
	}
	return nil
}

// syncAll brings a folder and all that is in it to the disk.
func syncAll(dir string) error {
	return filepath.WalkDir(dir, func(path string, _ fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		return sync(path)
	})
}

// sync brings a file, or the entries of a folder, to the disk.
func sync(path string) error {
	f, err := os.Open(path)
	if err != nil {
		return err
	}
	defer f.Close()
	if err := f.Sync(); err != nil && !errors.Is(err, errors.ErrUnsupported) {
		return Plainly(err, filepath.Base(path))
	}
	return nil
}

// Plainly says in plain words why a file or folder cannot be written.
func Plainly(err error, path string) error {
	switch {
	case errors.Is(err, fs.ErrPermission):
		return refuse("name a folder that you may write to", "%s: no right to write there", path)
	case errors.Is(err, fs.ErrNotExist):
		return refuse("check the path", "%s: there is no such folder", path)
	case errors.Is(err, syscall.ENOTDIR):
		return refuse("check the path", "%s: a part of this path is a file, not a folder", path)
	case errors.Is(err, syscall.EROFS):
		return refuse("name a folder on another disk", "%s: the disk can only be read", path)
	case errors.Is(err, syscall.ENOSPC), errors.Is(err, syscall.EDQUOT), errors.Is(err, syscall.EFBIG):
		return &noRoom{refusal{fmt.Errorf("%s: there is no room left to write it", path), "make room, name a folder on another disk, or write less with --write"}}
	}
	return err
}

// noRoom is a refusal because of a full disk.
type noRoom struct{ refusal }

// NoRoom reports whether err is that of a full disk: what comes next would fail as well.
func NoRoom(err error) bool {
	var full *noRoom
	return errors.As(err, &full)
}
