package batch

import (
	"bytes"
	"cmp"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"time"

	"drumlin/basis2d/blocks"
	"drumlin/cmd/internal/pipeline"
)

// ReadLedgers returns the lines of all ledgers in the folder dir, that of the whole run and those of parts, without
// changing them. Lines stand in the order of their file; the whole run's come first, then those of the parts in order.
// A last line that was cut short is left out; another that cannot be read is an error that names it. A folder without
// ledgers has no lines.
func ReadLedgers(dir string) ([]Line, error) {
	files, err := listLedgers(dir)
	if err != nil {
		return nil, err
	}
	parts := make([][]Line, len(files))
	for i, name := range files {
		content, err := readLedger(filepath.Join(dir, name))
		if err != nil {
			return nil, err
		}
		parts[i] = content.lines
	}
	return slices.Concat(parts...), nil
}

// Latest returns the last word on each region: the line that ended last, and of those that ended together the last one.
func Latest(lines []Line) map[string]Line {
	last := make(map[string]int, len(lines))
	for i, line := range lines {
		if k, ok := last[line.Region]; !ok || !line.Ended.Before(lines[k].Ended) {
			last[line.Region] = i
		}
	}
	latest := make(map[string]Line, len(last))
	for region, i := range last {
		latest[region] = lines[i]
	}
	return latest
}

var partLedger = regexp.MustCompile(`^ledger\.part-([1-9][0-9]{0,8})-of-([1-9][0-9]{0,8})\.jsonl$`)

// listLedgers lists the ledgers in a folder, the whole run's first, then those of parts by their division and number.
func listLedgers(dir string) ([]string, error) {
	entries, err := os.ReadDir(dir)
	if err != nil {
		return nil, pipeline.Plainly(err, dir)
	}
	type file struct {
		name      string
		of, index int // zero for the whole
	}
	var files []file
	for _, e := range entries {
		if e.Name() == ledgerName {
			files = append(files, file{name: ledgerName})
		} else if m := partLedger.FindStringSubmatch(e.Name()); m != nil {
			index, _ := strconv.Atoi(m[1])
			of, _ := strconv.Atoi(m[2])
			files = append(files, file{e.Name(), of, index})
		}
	}
	slices.SortFunc(files, func(a, b file) int { return cmp.Or(a.of-b.of, a.index-b.index) })
	names := make([]string, len(files))
	for i, f := range files {
		names[i] = f.name
	}
	return names, nil
}

// ledgerText is what a ledger's file holds.
type ledgerText struct {
	lines []Line
	raw   [][]byte // the same lines as they stand there, without the space around them
	whole int64    // bytes up to the end of the last whole line
	torn  bool     // whether something is left after it
}

func readLedger(path string) (ledgerText, error) {
	data, err := os.ReadFile(path)
	if err != nil {
		return ledgerText{}, pipeline.Plainly(err, path)
	}
	content, err := parseLedger(data)
	if err != nil {
		return ledgerText{}, &fault{fmt.Sprintf("%s: %v", path, err), "remove that line: the region's folder is taken up again if it is whole"}
	}
	return content, nil
}

// parseLedger reads the lines of a ledger. Only the last one may be cut short. Blank lines, which a person may have left,
// do not count.
func parseLedger(data []byte) (ledgerText, error) {
	text := ledgerText{}
	var number []int // of each line in the file, from 1
	for n, rest := 1, data; len(rest) > 0; n++ {
		line, after, ended := bytes.Cut(rest, []byte("\n"))
		line = bytes.TrimSpace(line)
		last := len(after) == 0
		if !ended || last && len(line) > 0 && !json.Valid(line) {
			text.torn = true
			break
		}
		if len(line) > 0 {
			text.raw, number = append(text.raw, line), append(number, n)
		}
		rest = after
		text.whole = int64(len(data) - len(rest))
	}
	text.lines = make([]Line, len(text.raw))
	err := blocks.Do(context.Background(), 0, blocks.Count(len(text.raw)), func(_, b int) error {
		from, to := blocks.Range(b, len(text.raw))
		for i := from; i < to; i++ {
			if err := json.Unmarshal(text.raw[i], &text.lines[i]); err != nil {
				return fmt.Errorf("line %d is none of a ledger: %s", number[i], unreadable(err))
			}
			if text.lines[i].Region == "" {
				return fmt.Errorf("line %d is none of a ledger: it names no region", number[i])
			}
		}
		return nil
	})
	if err != nil {
		return ledgerText{}, err
	}
	return text, nil
}

// unreadable says what is wrong with a line.
func unreadable(err error) string {
	var syntax *json.SyntaxError
	var kind *json.UnmarshalTypeError
	var moment *time.ParseError
	switch {
	case errors.As(err, &syntax):
		return fmt.Sprintf("from byte %d on it is no JSON", syntax.Offset)
	case errors.As(err, &kind) && kind.Field == "":
		return "it is no object"
	case errors.As(err, &kind):
		return fmt.Sprintf("its %q is a %s", kind.Field[strings.LastIndex(kind.Field, ".")+1:], kind.Value)
	case errors.As(err, &moment):
		return fmt.Sprintf("%q is no time", strings.Trim(moment.Value, `"`))
	}
	return err.Error()
}
