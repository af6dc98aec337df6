package locks_test

import (
	"bufio"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"drumlin/cmd/internal/locks"
)

// TestMain is the test, or with LOCK_CHILD set to a path, a process that takes the lock there and keeps it.
func TestMain(m *testing.M) {
	path := os.Getenv("LOCK_CHILD")
	if path == "" {
		os.Exit(m.Run())
	}
	var err error
	if os.Getenv("LOCK_SHARED") != "" {
		_, err = locks.TakeShared(path)
	} else {
		_, err = locks.Take(path, "the long count")
	}
	fmt.Println(err)
	if err == nil {
		time.Sleep(time.Minute)
	}
}

// child starts a process that has the lock when child returns.
func child(t *testing.T, path string, more ...string) *exec.Cmd {
	t.Helper()
	c := exec.Command(os.Args[0])
	c.Env = append(append(os.Environ(), "LOCK_CHILD="+path), more...)
	out, err := c.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = c.Process.Kill(); _ = c.Wait() })
	if said, err := bufio.NewReader(out).ReadString('\n'); said != "<nil>\n" {
		t.Fatalf("the other process says %q, %v", said, err)
	}
	return c
}

func kill(t *testing.T, c *exec.Cmd) {
	t.Helper()
	if err := c.Process.Kill(); err != nil {
		t.Fatal(err)
	}
	_ = c.Wait()
}

// refused demands that the error is of a lock that is held, with advice, and returns it.
func refused(t *testing.T, err error) *locks.Held {
	t.Helper()
	var held *locks.Held
	if !errors.As(err, &held) {
		t.Fatalf("not refused: %v", err)
	}
	if held.Hint() == "" || held.Error() == "" {
		t.Error("the refusal says nothing")
	}
	return held
}

func take(t *testing.T, path string) (release func()) {
	t.Helper()
	release, err := locks.Take(path, "a test")
	if err != nil {
		t.Fatal(err)
	}
	return release
}

func share(t *testing.T, path string) (release func()) {
	t.Helper()
	release, err := locks.TakeShared(path)
	if err != nil {
		t.Fatal(err)
	}
	return release
}

func lockFile(t *testing.T) string {
	t.Helper()
	return filepath.Join(t.TempDir(), "run [1].lock")
}

func TestOtherProcess(t *testing.T) {
	path := lockFile(t)
	c := child(t, path)
	host, _ := os.Hostname()
	for name, attempt := range map[string]func() (func(), error){
		"alone":  func() (func(), error) { return locks.Take(path, "mine") },
		"shared": func() (func(), error) { return locks.TakeShared(path) },
	} {
		_, err := attempt()
		held := refused(t, err)
		h := held.Holder
		if held.Path != path || h.PID != c.Process.Pid || h.Host != host || h.Doing != "the long count" || time.Since(h.Since).Abs() > time.Minute {
			t.Errorf("%s: %+v", name, *held)
		}
		want := fmt.Sprintf("another drumlin (process %d on host %s) holds %s: the long count, since ", c.Process.Pid, host, filepath.ToSlash(path))
		if !strings.HasPrefix(err.Error(), want) {
			t.Errorf("%s: %v", name, err)
		}
	}
	if h, held := locks.HeldBy(path); !held || h.PID != c.Process.Pid {
		t.Errorf("%+v, %v", h, held)
	}
	kill(t, c)
	if _, err := os.Stat(path); err != nil {
		t.Fatalf("nothing is left of the killed process, so nothing is tested: %v", err)
	}
	if h, held := locks.HeldBy(path); held {
		t.Errorf("the dead hold it: %+v", h)
	}
	release := take(t, path)
	_, err := locks.Take(path, "another")
	if held := refused(t, err); held.Holder.PID != os.Getpid() || held.Holder.Doing != "a test" {
		t.Errorf("the lock names %+v", held.Holder)
	}
	release()
}

// A longer text of a killed process must not show behind or instead of that of the next.
func TestLeftOverText(t *testing.T) {
	for name, text := range map[string]string{
		"longer":  `{"pid":1,"host":"` + strings.Repeat("x", 1000) + "\"}\nand more\n",
		"no text": "", "no JSON": "hello\n", "cut short": `{"pid":1`, "a list": "[]\n", "no number": `{"pid":"1"}` + "\n",
	} {
		path := lockFile(t)
		if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
		release := take(t, path)
		raw, err := os.ReadFile(path)
		var h locks.Holder
		if err != nil || json.Unmarshal(raw, &h) != nil || strings.Count(string(raw), "\n") != 1 {
			t.Errorf("%s: the file holds %q, %v", name, raw, err)
		}
		if h.PID != os.Getpid() || h.Doing != "a test" {
			t.Errorf("%s: the file names %+v", name, h)
		}
		// Somebody may write over it: the lock holds, and nobody is named wrongly.
		if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
		_, err = locks.Take(path, "another")
		if held := refused(t, err); name != "longer" && (held.Holder != locks.Holder{} || !strings.HasPrefix(err.Error(), "another drumlin holds ")) {
			t.Errorf("%s: %v", name, err)
		}
		release()
	}
}

func TestRelease(t *testing.T) {
	path := lockFile(t)
	release := take(t, path)
	release()
	if _, err := os.Stat(path); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("the file is still there: %v", err)
	}
	if h, held := locks.HeldBy(path); held {
		t.Errorf("%+v holds what is not there", h)
	}
	again := take(t, path)
	release() // of a lock that is given back already: it must not remove the file of the next
	_, err := locks.Take(path, "another")
	refused(t, err)
	again()
}

func TestShared(t *testing.T) {
	path := lockFile(t)
	kill(t, child(t, path)) // its name must not be told for that of those who share
	first, second := share(t, path), share(t, path)
	_, err := locks.Take(path, "all")
	if held := refused(t, err); held.Holder != (locks.Holder{}) {
		t.Errorf("a shared lock names %+v", held.Holder)
	}
	if _, held := locks.HeldBy(path); !held {
		t.Error("nobody is said to have it")
	}
	first()
	first()
	_, err = locks.Take(path, "all")
	refused(t, err)
	second()
	release := take(t, path)
	_, err = locks.TakeShared(path)
	if held := refused(t, err); held.Holder.PID != os.Getpid() {
		t.Errorf("the lock names %+v", held.Holder)
	}
	release()
	if left, _ := os.ReadDir(filepath.Dir(path)); len(left) > 0 {
		t.Errorf("%s is left", left[0].Name())
	}
}

func TestSharedByAnotherProcess(t *testing.T) {
	path := lockFile(t)
	c := child(t, path, "LOCK_SHARED=yes")
	release := share(t, path)
	release()
	_, err := locks.Take(path, "all")
	refused(t, err)
	kill(t, c)
	take(t, path)()
}

func TestNoFolder(t *testing.T) {
	path := filepath.Join(t.TempDir(), "none", "run.lock")
	for name, attempt := range map[string]func() (func(), error){
		"alone":   func() (func(), error) { return locks.Take(path, "mine") },
		"shared":  func() (func(), error) { return locks.TakeShared(path) },
		"waiting": func() (func(), error) { return locks.Wait(t.Context(), path, "mine", nil) },
	} {
		if _, err := attempt(); !errors.Is(err, fs.ErrNotExist) {
			t.Errorf("%s: %v", name, err)
		}
	}
}

func TestWait(t *testing.T) {
	path := lockFile(t)
	first := take(t, path)
	told := 0
	started := time.Now()
	release, err := locks.Wait(t.Context(), path, "after the first", func(h locks.Holder) {
		told++
		if h.PID != os.Getpid() || h.Doing != "a test" {
			t.Errorf("waiting for %+v", h)
		}
		time.AfterFunc(500*time.Millisecond, first)
	})
	if err != nil {
		t.Fatal(err)
	}
	if waited := time.Since(started); told != 1 || waited < 500*time.Millisecond {
		t.Errorf("told %d times, waited %v", told, waited)
	}
	_, err = locks.Take(path, "another")
	if held := refused(t, err); held.Holder.Doing != "after the first" {
		t.Errorf("the lock names %+v", held.Holder)
	}
	release()
	release, err = locks.Wait(t.Context(), path, "at once", func(locks.Holder) { t.Error("it was free") })
	if err != nil {
		t.Fatal(err)
	}
	release()
}

func TestWaitIsCancelled(t *testing.T) {
	path := lockFile(t)
	defer take(t, path)()
	ctx, cancel := context.WithCancel(t.Context())
	release, err := locks.Wait(ctx, path, "in vain", func(locks.Holder) { cancel() })
	if !errors.Is(err, context.Canceled) || release != nil {
		t.Errorf("%v", err)
	}
	if _, err := locks.Wait(ctx, lockFile(t), "too late", nil); !errors.Is(err, context.Canceled) {
		t.Errorf("%v", err)
	}
}

func TestMessages(t *testing.T) {
	since := time.Date(2031, 5, 3, 14, 2, 11, 0, time.Local)
	for want, h := range map[string]locks.Holder{
		"another drumlin holds out/run.lock":                                                                   {},
		"another drumlin (process 4711) holds out/run.lock":                                                    {PID: 4711},
		"another drumlin (process 4711 on host vale) holds out/run.lock":                                       {PID: 4711, Host: "vale"},
		"another drumlin (process 4711 on host vale) holds out/run.lock: part 3/16":                            {PID: 4711, Host: "vale", Doing: "part 3/16"},
		"another drumlin (process 4711 on host vale) holds out/run.lock: part 3/16, since 2031-05-03 14:02:11": {PID: 4711, Host: "vale", Doing: "part 3/16", Since: since},
		"another drumlin (process 4711) holds out/run.lock: since 2031-05-03 14:02:11":                         {PID: 4711, Since: since},
	} {
		if got := (&locks.Held{Path: "out/run.lock", Holder: h}).Error(); got != want {
			t.Errorf("%q, not %q", got, want)
		}
	}
}
