package main

import (
	"errors"
	"slices"
	"strings"
	"testing"
)

func TestArrange(t *testing.T) {
	options := []option{{name: "response", arg: "COLUMN"}, {name: "threshold", arg: "NUMBER"}, {name: "linear", arg: "COLUMN", repeat: true}, {name: "strict"}}
	tests := []struct {
		name string
		args []string
		want string // joined by blanks
	}{
		{"nothing", nil, "--"},
		{"flags first", []string{"--response", "zn", "w.csv"}, "--response=zn -- w.csv"},
		{"flags last", []string{"w.csv", "--response", "zn"}, "--response=zn -- w.csv"},
		{"flags on both sides", []string{"--strict", "w.csv", "--response=zn"}, "--strict=true --response=zn -- w.csv"},
		{"a flag that stands alone takes nothing", []string{"--strict", "false"}, "--strict=true -- false"},
		{"unless it is tied to it", []string{"--strict=false"}, "--strict=false --"},
		{"a negative number", []string{"--threshold", "-3"}, "--threshold=-3 --"},
		{"one without a nought", []string{"--threshold", "-.5"}, "--threshold=-.5 --"},
		{"one with an exponent", []string{"--threshold", "-1e-3"}, "--threshold=-1e-3 --"},
		{"a value with a hyphen", []string{"--response=-zn", "w.csv"}, "--response=-zn -- w.csv"},
		{"a value with an equals sign", []string{"--response=a=b"}, "--response=a=b --"},
		{"a value of one hyphen", []string{"--response", "-"}, "--response=- --"},
		{"an empty value", []string{"--response", "", "w.csv"}, "--response= -- w.csv"},
		{"again and again", []string{"--linear", "a,b", "--linear", "c"}, "--linear=a,b --linear=c --"},
		{"the end of flags", []string{"--response", "zn", "--", "--strict", "-3"}, "--response=zn -- --strict -3"},
		{"one hyphen is a name", []string{"-"}, "-- -"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			got, err := arrange("map", options, test.args)
			if err != nil || strings.Join(got, " ") != test.want {
				t.Errorf("got %q, %v", got, err)
			}
		})
	}
	for _, args := range [][]string{{"--help"}, {"w.csv", "-h"}, {"--response", "zn", "--help", "--banana"}} {
		if _, err := arrange("map", options, args); !errors.Is(err, errHelp) {
			t.Errorf("%q: %v", args, err)
		}
	}
	if got, err := arrange("map", options, []string{"--", "--help"}); err != nil || !slices.Equal(got, []string{"--", "--help"}) {
		t.Errorf("got %q, %v", got, err)
	}
}

// FuzzArrange: whatever is typed, the result is flags that are known, "--", and the rest; or an error of usage.
func FuzzArrange(f *testing.F) {
	f.Add("w.csv --response zn --threshold -3 -- x")
	f.Add("--strict --linear=a")
	options := []option{{name: "response", arg: "COLUMN"}, {name: "threshold", arg: "NUMBER"}, {name: "linear", arg: "COLUMN", repeat: true}, {name: "strict"}}
	f.Fuzz(func(t *testing.T, typed string) {
		got, err := arrange("map", options, strings.Split(typed, " "))
		var usage *usageError
		if err != nil {
			if !errors.Is(err, errHelp) && !errors.As(err, &usage) {
				t.Fatal(err)
			}
			return
		}
		for i, arg := range got {
			if arg == "--" {
				return
			}
			name, _, tied := strings.Cut(strings.TrimPrefix(arg, "--"), "=")
			if _, known := named(options, name); !known || !tied {
				t.Fatalf("argument %d of %q", i, got)
			}
		}
		t.Fatalf("no end of flags in %q", got)
	})
}
