package batch

import (
	"runtime"
	"strings"
	"testing"
)

func TestCPUKind(t *testing.T) {
	for name, c := range map[string]struct{ text, want string }{
		"two of a kind": {"processor\t: 0\nmodel\t\t: 17\nmodel name\t: Alder 9   Processor @ 2.20GHz \nflags : a b\n\nprocessor\t: 1\nmodel name\t: other\n", "Alder 9 Processor @ 2.20GHz"},
		"a part":        {"processor\t: 0\nCPU implementer\t: 0x41\nCPU part\t: 0xd0c\nCPU revision\t: 1\n\nCPU part\t: 0xd0d\n", runtime.GOARCH + " part 0xd0c"},
		"both":          {"CPU part : 0xd0c\nmodel name : Alder 9\n", "Alder 9"},
		"no name":       {"model name\t:\n", runtime.GOARCH},
		"neither":       {"cpu family : 6\nno colon\n", runtime.GOARCH},
		"nothing":       {"", runtime.GOARCH},
	} {
		if got := cpuKind(c.text); got != c.want {
			t.Errorf("%s: %q, not %q", name, got, c.want)
		}
	}
	if kind := CPUKind(); kind == "" || strings.Contains(kind, "\n") || kind != CPUKind() {
		t.Errorf("here it is %q", kind)
	}
}
