package main

import (
	"errors"
	"strings"

	"drumlin/io/plan"
)

// errHelp is returned by arrange when help was asked for.
var errHelp = errors.New("help was asked for")

// arrange puts the arguments of a command in the order in which urfave/cli reads them: flags as --name=value, then
// "--", then the rest. Flags and the rest may be mixed; "--" ends the flags. The value of a flag follows it after "="
// or as the next argument; a next argument that begins with a hyphen is a value only if it is a negative number.
// The error is errHelp or a *usageError.
func arrange(command string, options []option, args []string) ([]string, error) {
	var flags, rest []string
	said := map[string]bool{}
	for i := 0; i < len(args); i++ {
		arg := args[i]
		if arg == "--" {
			rest = append(rest, args[i+1:]...)
			break
		}
		if !strings.HasPrefix(arg, "-") || arg == "-" {
			rest = append(rest, arg)
			continue
		}
		if arg == "--help" || arg == "-h" {
			return nil, errHelp
		}
		name, value, given := strings.Cut(strings.TrimPrefix(arg, "--"), "=")
		o, known := named(options, name)
		if !known || !strings.HasPrefix(arg, "--") {
			return nil, unknownFlag(command, options, arg)
		}
		if !o.alone() && !given {
			if i+1 == len(args) || looksLikeFlag(args[i+1]) {
				return nil, missingValue(o, args[i+1:])
			}
			i++
			value = args[i]
		}
		if said[name] && !o.repeat && !o.alone() {
			return nil, misuse("keep one of the two", "--%s is given twice", name)
		}
		said[name] = true
		if o.alone() && !given {
			value = "true"
		}
		flags = append(flags, "--"+name+"="+value)
	}
	return append(append(flags, "--"), rest...), nil
}

// looksLikeFlag reports whether an argument begins as a flag does and is not a negative number.
func looksLikeFlag(arg string) bool {
	if len(arg) < 2 || arg[0] != '-' {
		return false
	}
	number := strings.TrimPrefix(arg[1:], ".")
	return number == "" || number[0] < '0' || number[0] > '9'
}

func missingValue(o option, next []string) error {
	hint := "write --" + o.name + " " + o.arg
	if len(next) > 0 && next[0] != "--" {
		hint += ", or --" + o.name + "=" + o.arg + " if it begins with a hyphen"
	}
	return misuse(hint, "--%s needs a value", o.name)
}

func unknownFlag(command string, options []option, arg string) error {
	name, _, _ := strings.Cut(strings.TrimLeft(arg, "-"), "=")
	names := []string{"help"}
	for _, o := range options {
		names = append(names, o.name)
	}
	hint := "drumlin " + command + " --help lists the flags"
	if near, ok := plan.Nearest(name, names); ok {
		hint = "did you mean --" + near + "?"
	}
	written, _, _ := strings.Cut(arg, "=")
	return misuse(hint, "unknown flag %s", written)
}
