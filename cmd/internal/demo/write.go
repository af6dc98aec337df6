package demo

import (
	"bytes"
	"encoding/csv"
	"encoding/json"
	"os"
	"path/filepath"
	"slices"
	"strings"
)

// What the demonstration is made of.
const (
	seed         = 20
	plotCount    = 300
	villageCount = 250
)

// Command is one command of the demonstration, to be run from within its folder.
type Command struct {
	Aim  string   // what it is for, in a sentence without a stop
	Args []string // of drumlin, beginning with the name of the command
}

// Line is the command as it is typed in a shell.
func (c Command) Line() string {
	words := []string{"drumlin"}
	for _, a := range c.Args {
		words = append(words, quoted(a))
	}
	return strings.Join(words, " ")
}

// Commands returns the commands of the demonstration in their order. They name their outputs with --force, so that
// they can be run again where they have been run.
func Commands() []Command {
	return []Command{
		{"Plants per hectare on the island of Orrimay, and how many there are in each of its zones", []string{
			"map", "data/plots.csv", "--response", "plants", "--area", "plot_ha", "--area-unit", "ha",
			"--zones", "data/zones.geojson", "--zone-name", "zone", "--threshold", "250",
			"--title", "Marshlight on Orrimay", "--unit-label", "plants per ha", "--out", "plots", "--force"}},
		{"The same plants as if the peat were equally deep everywhere", []string{
			"map", "data/plots.csv", "--response", "plants", "--area", "plot_ha", "--area-unit", "ha",
			"--linear", "depth_cm", "--hold", "depth_cm=mean",
			"--title", "Marshlight on Orrimay, peat of mean depth", "--unit-label", "plants per ha", "--out", "plots-adjusted", "--force"}},
		{"Cases per 1000 residents on the Vessal Banks, and where they are surely more than 5", []string{
			"map", "data/villages.csv", "--response", "cases", "--people", "residents", "--per", "1000", "--threshold", "5",
			"--reference", "overall", "--title", "Illness on the Vessal Banks", "--unit-label", "cases per 1000 residents",
			"--out", "villages", "--force"}},
	}
}

// Script is the text of commands.txt: the commands with what they are for. A shell can run it.
func Script(commands []Command) string {
	var b strings.Builder
	b.WriteString("# The commands that made this folder, to be run from within it. All places and numbers are invented.\n")
	if slices.ContainsFunc(commands, func(c Command) bool { return slices.Contains(c.Args, "--force") }) {
		b.WriteString("# --force replaces the folders that are already here.\n")
	}
	for _, c := range commands {
		b.WriteString("\n# " + c.Aim + "\n" + c.Line() + "\n")
	}
	return b.String()
}

// Write writes the data sets and commands.txt to the folder dir, which must exist.
func Write(dir string) error {
	plots, err := table(plotTable(Plots(seed, plotCount)))
	if err != nil {
		return err
	}
	villages, err := table(villageTable(Villages(seed, villageCount)))
	if err != nil {
		return err
	}
	polygons, err := json.Marshal(zones())
	if err != nil {
		return err
	}
	return files{
		{"data/plots.csv", plots},
		{"data/zones.geojson", append(polygons, '\n')},
		{"data/villages.csv", villages},
		{"commands.txt", []byte(Script(Commands()))},
	}.write(dir)
}

// files are what a demonstration begins with.
type files []struct {
	name    string
	content []byte
}

func (f files) write(dir string) error {
	if err := os.Mkdir(filepath.Join(dir, "data"), 0o777); err != nil {
		return err
	}
	for _, file := range f {
		if err := os.WriteFile(filepath.Join(dir, filepath.FromSlash(file.name)), file.content, 0o666); err != nil {
			return err
		}
	}
	return nil
}

func table(rows [][]string) ([]byte, error) {
	var b bytes.Buffer
	w := csv.NewWriter(&b)
	if err := w.WriteAll(rows); err != nil {
		return nil, err
	}
	return b.Bytes(), nil
}

// quoted puts a word in single quotes if a shell would not take it as it is. No word has a single quote in it.
func quoted(word string) string {
	plain := func(r rune) bool {
		return r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r >= '0' && r <= '9' || strings.ContainsRune("-_./=", r)
	}
	if strings.TrimFunc(word, plain) == "" && word != "" {
		return word
	}
	return "'" + word + "'"
}
