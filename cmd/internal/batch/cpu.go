package batch

import (
	"os"
	"runtime"
	"strings"
	"sync"
)

// CPUKind names the kind of processor, on which the last digits of results and their seconds depend: its model, where
// the system tells it, else its architecture.
func CPUKind() string { return ownKind() }

var ownKind = sync.OnceValue(func() string {
	text, err := os.ReadFile("/proc/cpuinfo") // of Linux
	if err != nil {
		return runtime.GOARCH
	}
	return cpuKind(string(text))
})

// cpuKind finds the first processor's kind. Processors of the ARM kind have no model's name, but the number of their
// design, under "CPU part".
func cpuKind(cpuinfo string) string {
	part := ""
	for line := range strings.Lines(cpuinfo) {
		name, value, _ := strings.Cut(line, ":")
		name, value = strings.TrimSpace(name), strings.Join(strings.Fields(value), " ")
		switch {
		case value == "":
		case name == "model name":
			return value
		case name == "CPU part" && part == "":
			part = runtime.GOARCH + " part " + value
		}
	}
	if part == "" {
		return runtime.GOARCH
	}
	return part
}
