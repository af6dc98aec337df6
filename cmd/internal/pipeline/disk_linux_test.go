package pipeline

import (
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
)

// TestFullDisk runs out of room in the middle of each file in turn, on a file system of its own.
func TestFullDisk(t *testing.T) {
	if os.Getuid() != 0 {
		t.Skip("only root may mount a small file system; the script full-disk.txtar does the same with a limit on files")
	}
	obs := write(t, "obs.csv", plain.table(1))
	s := settings(t, obs, "response=zinc", "threshold=30", "cells-across=30")
	full := 0
	for _, size := range []string{"4k", "16k", "64k", "128k", "192k", "256k", "320k", "8m"} {
		disk := t.TempDir()
		if err := syscall.Mount("tmpfs", disk, "tmpfs", 0, "size="+size); err != nil {
			t.Skipf("a small file system cannot be mounted here: %v", err)
		}
		_, err := Run(t.Context(), s, filepath.Join(disk, "a", "out"), silent{})
		left, _ := os.ReadDir(disk)
		if unmount := syscall.Unmount(disk, 0); unmount != nil {
			t.Fatal(unmount)
		}
		if err == nil {
			continue
		}
		full++
		if !strings.Contains(err.Error(), "there is no room left to write it") || strings.Contains(err.Error(), disk) || hintOf(err) == "" {
			t.Errorf("%s: %v, hint %q", size, err, hintOf(err))
		}
		if len(left) > 0 {
			t.Errorf("%s: %s is left behind", size, left[0].Name())
		}
	}
	if full < 3 || full > 7 {
		t.Errorf("%d of the file systems were too small", full)
	}
}
