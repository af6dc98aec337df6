package main

import (
	"runtime/debug"
	"strings"
	"testing"
)

func TestDescribe(t *testing.T) {
	revision := debug.BuildSetting{Key: "vcs.revision", Value: "0123abc"}
	tests := []struct {
		name string
		info debug.BuildInfo
		want string
	}{
		{"nothing known", debug.BuildInfo{}, "drumlin unversioned"},
		{"a work tree", debug.BuildInfo{GoVersion: "go1.26.8", Main: debug.Module{Version: "(devel)"}}, "drumlin unversioned, go1.26.8"},
		{"a release", debug.BuildInfo{Main: debug.Module{Version: "v1.2.0"}, Settings: []debug.BuildSetting{revision}},
			"drumlin v1.2.0, revision 0123abc"},
		{"local changes", debug.BuildInfo{Settings: []debug.BuildSetting{revision, {Key: "vcs.modified", Value: "true"}}},
			"drumlin unversioned, revision 0123abc with local changes"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			if got := describe(&test.info); got != test.want {
				t.Errorf("got %q", got)
			}
		})
	}
	p, _, stdout, _ := faked(nil)
	if code := p.run(t.Context(), line("--version")); code != exitDone || !strings.HasPrefix(stdout.String(), "drumlin ") {
		t.Errorf("exit %d, %q", code, stdout)
	}
}
