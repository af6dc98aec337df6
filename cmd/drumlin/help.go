package main

import (
	"bytes"
	"fmt"
	"io"
	"strings"
	"unicode/utf8"
)

// The help is set on lines of at most helpWidth letters: flags to the left of helpColumn, what they mean to its right.
const (
	helpWidth  = 96
	helpColumn = 26
)

// printHelp prints what the program does, its commands and its exit codes.
func printHelp(w io.Writer, commands []command) error {
	var b bytes.Buffer
	b.WriteString(wrap("drumlin makes maps out of scattered field observations: the level at every place, how sure it is, the chance "+
		"that it exceeds a limit, and totals over zones.", 0, helpWidth))
	b.WriteString("\nCommands\n")
	for _, c := range commands {
		fmt.Fprintf(&b, "  drumlin %s %s\n", c.name, c.synopsis)
		b.WriteString(wrap(c.summary, helpColumn, helpWidth))
	}
	b.WriteString("\nHelp\n")
	entry(&b, "drumlin COMMAND --help", "what a command does, its flags, and an example")
	entry(&b, "drumlin --version", "which drumlin this is")
	b.WriteString("\nExit codes\n")
	for _, e := range exitMeanings {
		entry(&b, fmt.Sprint(e.code), e.meaning)
	}
	b.WriteString("\nTo begin with\n\n  drumlin demo --out demo\n")
	_, err := w.Write(b.Bytes())
	return err
}

// printCommandHelp prints what a command does, its flags by group, and an example.
func printCommandHelp(w io.Writer, c command) error {
	var b bytes.Buffer
	fmt.Fprintf(&b, "drumlin %s %s\n", c.name, c.synopsis)
	for paragraph := range strings.SplitSeq(c.about, "\n\n") {
		b.WriteString("\n" + wrap(paragraph, 0, helpWidth))
	}
	for _, group := range groups(c.options) {
		b.WriteString("\n" + group + "\n")
		for _, o := range c.options {
			if o.group == group {
				entry(&b, strings.TrimSpace("--"+o.name+" "+o.arg), meaning(o))
			}
		}
	}
	b.WriteString("\nExample\n")
	for line := range strings.SplitSeq(c.example, "\n") {
		if line != "" {
			line = "  " + line
		}
		b.WriteString(line + "\n")
	}
	b.WriteString("\ndrumlin --help lists the exit codes.\n")
	_, err := w.Write(b.Bytes())
	return err
}

func meaning(o option) string {
	text := o.help
	if o.repeat {
		text += "; may be given again"
	}
	if o.preset != "" {
		text += " (default " + o.preset + ")"
	}
	return text
}

// groups lists the groups in the order in which they first occur.
func groups(options []option) []string {
	var list []string
	seen := map[string]bool{}
	for _, o := range options {
		if !seen[o.group] {
			seen[o.group] = true
			list = append(list, o.group)
		}
	}
	return list
}

// entry writes a term and what it means, side by side, or one below the other where the term is too long.
func entry(b *bytes.Buffer, term, meaning string) {
	text := wrap(meaning, helpColumn, helpWidth)
	if length := utf8.RuneCountInString(term); length+4 <= helpColumn {
		b.WriteString("  " + term + text[length+2:])
		return
	}
	b.WriteString("  " + term + "\n" + text)
}

// wrap breaks text at blanks into lines that begin with indent blanks and are at most width letters long, as far as the
// words allow it. Every line ends in a line feed.
func wrap(text string, indent, width int) string {
	var b strings.Builder
	column := 0
	for _, word := range strings.Fields(text) {
		length := utf8.RuneCountInString(word)
		switch {
		case column == 0:
			b.WriteString(strings.Repeat(" ", indent))
			column = indent
		case column+1+length > width:
			b.WriteString("\n" + strings.Repeat(" ", indent))
			column = indent
		default:
			b.WriteByte(' ')
			column++
		}
		b.WriteString(word)
		column += length
	}
	b.WriteByte('\n')
	return b.String()
}
