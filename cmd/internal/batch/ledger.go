package batch

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"sync"
	"time"

	"drumlin/cmd/internal/pipeline"
)

// Line is what the ledger says of one region: what it came to, and when, where and from what.
type Line struct {
	Region string `json:"region"` // as the plan names it; must be UTF-8 and not empty
	Folder string `json:"folder"`
	Status Status `json:"status"`
	Reason string `json:"reason"` // why it failed, with the advice
	Figures
	Seconds     float64   `json:"seconds"`
	CPU         string    `json:"cpu"`
	Host        string    `json:"host"`
	Part        string    `json:"part"` // such as 3/16; empty for the whole
	Ended       time.Time `json:"ended"`
	Fingerprint string    `json:"fingerprint"`
	Version     string    `json:"version"`
}

// Ledger is a file of lines, one a region, that is only ever added to. A line is on the disk when Append returns.
type Ledger struct {
	path string

	mu   sync.Mutex
	file *os.File
	size int64 // of the lines that are whole
	torn bool  // something after them could not be removed yet
}

// ledgerName is the file of the whole run's ledger.
const ledgerName = "ledger.jsonl"

// ledgerFile names the file of the ledger of a part, written as 3/16; the whole run's for an empty part.
func ledgerFile(part string) (string, error) {
	if part == "" {
		return ledgerName, nil
	}
	first, last, _ := strings.Cut(part, "/")
	index, err := strconv.Atoi(first)
	of, err2 := strconv.Atoi(last)
	if err != nil || err2 != nil || index < 1 || index > of {
		return "", &fault{fmt.Sprintf("%q is no part of a batch", part), "write it as 3/16, the third of sixteen"}
	}
	return fmt.Sprintf("ledger.part-%d-of-%d.jsonl", index, of), nil
}

// OpenLedger opens the ledger in the folder dir for adding lines; part is that of the run, written as 3/16, or empty. A
// last line that was cut short, having no end or being no JSON, is removed, and dropped is then 1. A line that cannot be
// read otherwise is an error that names it. Whoever opens a ledger must have it for himself.
func OpenLedger(dir string, part string) (l *Ledger, dropped int, err error) {
	name, err := ledgerFile(part)
	if err != nil {
		return nil, 0, err
	}
	l = &Ledger{path: filepath.Join(dir, name)}
	if _, err := os.Lstat(l.path); errors.Is(err, fs.ErrNotExist) { // made so that it is in its folder on the disk, too
		if err := pipeline.ReplaceFile(context.Background(), l.path, nothing); err != nil {
			return nil, 0, err
		}
	}
	content, err := readLedger(l.path)
	if err != nil {
		return nil, 0, err
	}
	if l.file, err = os.OpenFile(l.path, os.O_APPEND|os.O_WRONLY, 0o644); err != nil {
		return nil, 0, pipeline.Plainly(err, l.path)
	}
	l.size = content.whole
	if content.torn {
		if err := l.cutBack(); err != nil {
			return nil, 0, errors.Join(pipeline.Plainly(err, l.path), l.file.Close())
		}
		dropped = 1
	}
	return l, dropped, nil
}

// Append adds a line, and returns when it is on the disk. After an error the line is not in the ledger, nor a half of
// it, as far as the disk allows; the error is pipeline.NoRoom if the disk is full. It is safe for concurrent use.
func (l *Ledger) Append(line Line) error {
	text, err := encodeLine(line)
	if err != nil {
		return err
	}
	l.mu.Lock()
	defer l.mu.Unlock()
	if l.torn {
		if err := l.cutBack(); err != nil {
			return pipeline.Plainly(err, l.path)
		}
	}
	_, err = l.file.Write(text)
	if err == nil {
		err = l.file.Sync()
	}
	if err != nil {
		l.torn = true
		_ = l.cutBack() // else before the next line, or when the ledger is opened again
		return pipeline.Plainly(err, l.path)
	}
	l.size += int64(len(text))
	return nil
}

// Close closes the ledger. Nothing can be added after that.
func (l *Ledger) Close() error {
	l.mu.Lock()
	defer l.mu.Unlock()
	return l.file.Close()
}

// cutBack removes what stands after the last whole line.
func (l *Ledger) cutBack() error {
	if err := l.file.Truncate(l.size); err != nil {
		return err
	}
	if err := l.file.Sync(); err != nil {
		return err
	}
	l.torn = false
	return nil
}

// encodeLine writes a line as JSON with its line feed.
func encodeLine(line Line) ([]byte, error) {
	if line.Region == "" {
		return nil, errors.New("a line of the ledger names no region")
	}
	line.Ended = line.Ended.UTC()
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	if err := e.Encode(line); err != nil {
		return nil, fmt.Errorf("the ledger's line of %s: %w", line.Region, err)
	}
	return b.Bytes(), nil
}
