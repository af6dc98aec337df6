package main

import (
	"bytes"
	"fmt"
	"io"
)

// toStdout writes what print makes in one go, and names the stream if that fails.
func toStdout(w io.Writer, print func(io.Writer) error) error {
	var b bytes.Buffer
	if err := print(&b); err != nil {
		return err
	}
	if _, err := w.Write(b.Bytes()); err != nil {
		return fmt.Errorf("standard output: %w", err)
	}
	return nil
}
