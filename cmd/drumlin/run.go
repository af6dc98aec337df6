package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"strings"

	"drumlin/io/plan"

	"github.com/urfave/cli/v2"
)

// run carries out one command line and returns the exit code. It never ends the process itself.
func run(ctx context.Context, args []string, stdin io.Reader, stdout, stderr io.Writer) int {
	p := program{work: realWork(), stdin: stdin, stdout: stdout, stderr: stderr}
	return p.run(ctx, args)
}

// program is the command line with its streams and with the functions that do the work.
type program struct {
	work           work
	stdin          io.Reader
	stdout, stderr io.Writer
}

func (p program) run(ctx context.Context, args []string) int {
	err := p.dispatch(ctx, args)
	if err != nil {
		complain(p.stderr, err)
	}
	return exitCode(err)
}

// command is one command as the help shows it and as urfave/cli runs it.
type command struct {
	name     string
	synopsis string // what follows the name on the usage line
	summary  string // half a line for the list of commands
	about    string // paragraphs
	example  string
	options  []option
	run      func(ctx context.Context, rest []string) error
}

func (p program) commands() []command {
	return []command{p.mapCommand(), p.batchCommand(), p.inspectCommand(), p.reuseCommand(), p.demoCommand()}
}

// dispatch finds the command and has it carried out. Called with nothing, the program
// shows its help: who types the bare name is asking what it does.
func (p program) dispatch(ctx context.Context, args []string) error {
	commands := p.commands()
	if len(args) < 2 {
		return printHelp(p.stdout, commands)
	}
	switch first := args[1]; {
	case first == "--help" || first == "-h":
		return printHelp(p.stdout, commands)
	case first == "--version":
		return printVersion(p.stdout)
	case first == "help":
		return p.help(commands, args[2:])
	case strings.HasPrefix(first, "-"):
		return misuse("flags stand after the command; drumlin --help lists the commands", "unknown flag %s before a command", first)
	}
	c, err := findCommand(commands, args[1])
	if err != nil {
		return err
	}
	return p.carryOut(ctx, c, args[2:])
}

// carryOut puts the arguments of a command in order and has urfave/cli run it.
func (p program) carryOut(ctx context.Context, c command, args []string) error {
	arranged, err := arrange(c.name, c.options, args)
	if errors.Is(err, errHelp) {
		return printCommandHelp(p.stdout, c)
	}
	if err != nil {
		return err
	}
	return p.app(c).RunContext(ctx, append([]string{"drumlin", c.name}, arranged...))
}

// app wraps the command for urfave/cli with everything switched off by which the library would print or end the
// process on its own.
func (p program) app(c command) *cli.App {
	passOn := func(_ *cli.Context, err error, _ bool) error { return misuse("", "%v", err) }
	flags := make([]cli.Flag, len(c.options))
	for i, o := range c.options {
		flags[i] = o
	}
	return &cli.App{
		Name: "drumlin", Reader: p.stdin, Writer: p.stdout, ErrWriter: p.stderr,
		HideHelp: true, HideHelpCommand: true, HideVersion: true,
		OnUsageError:   passOn,
		ExitErrHandler: func(*cli.Context, error) {},
		Commands: []*cli.Command{{
			Name: c.name, Flags: flags, HideHelp: true, HideHelpCommand: true, OnUsageError: passOn,
			Action: func(cc *cli.Context) error {
				if err := c.deliver(cc); err != nil {
					return err
				}
				return c.run(cc.Context, cc.Args().Slice())
			},
		}},
	}
}

// deliver hands the values of the flags to whoever takes them, in the order of the options.
func (c command) deliver(cc *cli.Context) error {
	for _, o := range c.options {
		values, _ := cc.Value(o.name).([]string)
		for _, value := range values {
			if err := o.take(value); err != nil {
				return err
			}
		}
	}
	return nil
}

func (p program) help(commands []command, args []string) error {
	switch len(args) {
	case 0:
		return printHelp(p.stdout, commands)
	case 1:
		c, err := findCommand(commands, args[0])
		if err != nil {
			return err
		}
		return printCommandHelp(p.stdout, c)
	}
	return misuse("for example drumlin help map", "help takes one command, not %d", len(args))
}

func findCommand(commands []command, name string) (command, error) {
	var names []string
	for _, c := range commands {
		if c.name == name {
			return c, nil
		}
		names = append(names, c.name)
	}
	hint := "the commands are " + strings.Join(names, ", ")
	if near, ok := plan.Nearest(name, append(names, "help")); ok {
		hint = "did you mean drumlin " + near + "?"
	}
	return command{}, misuse(hint, "unknown command %q", name)
}

// single returns the one argument that a command takes besides its flags.
func (c command) single(rest []string, what string) (string, error) {
	usage := "drumlin " + c.name + " " + c.synopsis
	switch {
	case len(rest) == 0 || rest[0] == "":
		return "", misuse(usage, "%s needs %s", c.name, what)
	case len(rest) > 1:
		return "", misuse("quote a value that has spaces in it; the form is "+usage,
			"unexpected argument %q: %s is %q already", rest[1], what, rest[0])
	}
	return rest[0], nil
}

func (c command) none(rest []string) error {
	if len(rest) > 0 {
		return misuse("the form is drumlin "+c.name+" "+c.synopsis, "unexpected argument %q", rest[0])
	}
	return nil
}

// needs refuses a flag that was not given and that the command cannot do without.
func (c command) needs(name, value string) error {
	if value != "" {
		return nil
	}
	o, _ := named(c.options, name)
	return misuse(fmt.Sprintf("add --%s %s", name, o.arg), "%s needs --%s: %s", c.name, name, o.help)
}
