package batch

import (
	"bufio"
	"context"
	"io"
	"os"
	"path/filepath"

	"drumlin/cmd/internal/pipeline"
)

// MergeLedgers brings the lines of the parts' ledgers in the folder dir into that of the whole run, each once, and then
// removes the parts' ledgers. Cut short at any moment, it loses nothing, and done again it comes to the same: the whole
// run's ledger is replaced in one step, and the parts' are removed when that is on the disk. No ledger may be open
// meanwhile. Last lines that were cut short are left out. Without ledgers of parts it changes nothing.
func MergeLedgers(dir string) error {
	files, err := listLedgers(dir)
	if err != nil {
		return err
	}
	var parts []string
	for _, name := range files {
		if name != ledgerName {
			parts = append(parts, filepath.Join(dir, name))
		}
	}
	if len(parts) == 0 {
		return nil
	}
	var lines [][]byte
	known := map[string]bool{}
	for _, name := range files {
		content, err := readLedger(filepath.Join(dir, name))
		if err != nil {
			return err
		}
		for _, line := range content.raw {
			if name == ledgerName || !known[string(line)] {
				lines = append(lines, line)
			}
			known[string(line)] = true
		}
	}
	err = pipeline.ReplaceFile(context.Background(), filepath.Join(dir, ledgerName), func(w io.Writer) error {
		out := bufio.NewWriterSize(w, 1<<20)
		for _, line := range lines {
			_, _ = out.Write(line) // Flush returns the error
			_ = out.WriteByte('\n')
		}
		return out.Flush()
	})
	if err != nil {
		return err
	}
	for _, path := range parts {
		if err := os.Remove(path); err != nil {
			return pipeline.Plainly(err, path)
		}
	}
	return nil
}

// nothing is what a ledger begins with.
func nothing(io.Writer) error { return nil }
