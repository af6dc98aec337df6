package main

import (
	"flag"
	"slices"

	"drumlin/io/plan"

	"github.com/urfave/cli/v2"
)

// option is one flag of a command. It is a cli.Flag that hands every value over as it was written: a repeated flag is
// not split at commas.
type option struct {
	name   string
	group  string
	arg    string // what follows, in capitals; empty for a flag that stands alone
	help   string
	preset string // the default as the help shows it
	repeat bool
	take   func(value string) error // an empty value for a flag that stands alone
}

var _ cli.Flag = option{}

func (o option) alone() bool { return o.arg == "" }

func (o option) String() string  { return "--" + o.name }
func (o option) Names() []string { return []string{o.name} }
func (o option) IsSet() bool     { return false }

// Apply makes the flag known to the flag set that urfave/cli parses with. arrange has checked the arguments by then, so
// what can still fail is the value; the flag set would bury that error in a text of its own, so take is called later,
// by command.deliver.
func (o option) Apply(set *flag.FlagSet) error {
	set.Var(&sayings{alone: o.alone()}, o.name, o.help)
	return nil
}

// sayings collects the values that a flag was given, in order.
type sayings struct {
	alone  bool
	values []string
}

func (s *sayings) String() string         { return "" }
func (s *sayings) Set(value string) error { s.values = append(s.values, value); return nil }
func (s *sayings) IsBoolFlag() bool       { return s.alone }

// Get returns the values, for cli.Context.Value.
func (s *sayings) Get() any { return s.values }

// ofWord makes the flag of a word, which writes to s.
func ofWord(w plan.Word, s *plan.Settings) option {
	return option{
		name: w.Name, group: w.Group, arg: w.Arg, help: w.Help, preset: w.Default(), repeat: w.Repeat,
		take: func(value string) error { return w.Set(s, value) },
	}
}

// ofWords makes the flags of all words but those left out.
func ofWords(s *plan.Settings, except ...string) []option {
	var list []option
	for _, w := range plan.Words() {
		if !slices.Contains(except, w.Name) {
			list = append(list, ofWord(w, s))
		}
	}
	return list
}

// ofNamed makes the flags of the words with these names, under a heading of the command's own.
func ofNamed(s *plan.Settings, group string, names ...string) []option {
	var list []option
	for _, name := range names {
		w, _ := plan.Lookup(name)
		o := ofWord(w, s)
		o.group = group
		list = append(list, o)
	}
	return list
}

// ofText makes a flag with a text that must not be empty.
func ofText(name, group, arg, help string, to *string) option {
	return option{name: name, group: group, arg: arg, help: help, take: func(value string) error {
		if value == "" {
			return misuse("", "--%s: nothing is given", name)
		}
		*to = value
		return nil
	}}
}

func named(options []option, name string) (option, bool) {
	for _, o := range options {
		if o.name == name {
			return o, true
		}
	}
	return option{}, false
}
