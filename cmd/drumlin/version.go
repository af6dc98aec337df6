package main

import (
	"fmt"
	"io"
	"runtime/debug"
)

func printVersion(w io.Writer) error {
	info, ok := debug.ReadBuildInfo()
	if !ok {
		info = &debug.BuildInfo{}
	}
	_, err := fmt.Fprintln(w, describe(info))
	return err
}

// describe says in a line which drumlin this is, from what the Go linker knows.
func describe(info *debug.BuildInfo) string {
	setting := map[string]string{}
	for _, s := range info.Settings {
		setting[s.Key] = s.Value
	}
	version := info.Main.Version
	if version == "" || version == "(devel)" {
		version = "unversioned"
	}
	text := "drumlin " + version
	if revision := setting["vcs.revision"]; revision != "" {
		text += ", revision " + revision
		if setting["vcs.modified"] == "true" {
			text += " with local changes"
		}
	}
	if info.GoVersion != "" {
		text += ", " + info.GoVersion
	}
	return text
}
