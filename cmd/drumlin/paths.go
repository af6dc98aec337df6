package main

import (
	"os"
	"path/filepath"
	"strings"
)

// keepApart refuses an output that is an input, or a folder that holds one or in which the program was started:
// replacing it would take them away.
func keepApart(out string, inputs ...string) error {
	target := settled(out)
	for _, in := range inputs {
		switch source := settled(in); {
		case source == target:
			return misuse("choose another name for the output", "--out %s is also an input", out)
		case holds(target, source):
			return misuse("choose another folder", "--out %s holds the input %s", out, in)
		}
	}
	if here, err := os.Getwd(); err == nil {
		if here = settled(here); here == target || holds(target, here) {
			return misuse("name a folder of its own for the output", "--out %s is the current folder or one above it", out)
		}
	}
	return nil
}

// settled is the absolute path without symbolic links, as far down as it exists.
func settled(path string) string {
	path, err := filepath.Abs(path)
	if err != nil {
		return path
	}
	if real, err := filepath.EvalSymlinks(path); err == nil {
		return real
	}
	parent := filepath.Dir(path)
	if parent == path {
		return path
	}
	return filepath.Join(settled(parent), filepath.Base(path))
}

func holds(folder, path string) bool {
	rel, err := filepath.Rel(folder, path)
	return err == nil && rel != "." && rel != ".." && !strings.HasPrefix(rel, ".."+string(filepath.Separator))
}
