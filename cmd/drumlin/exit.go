package main

import (
	"context"
	"errors"
)

// The exit codes.
const (
	exitDone        = 0
	exitRequest     = 2   // the request or the input is wrong, or a file could not be read or written
	exitRegions     = 3   // a batch finished with regions that failed or carry a stop
	exitFit         = 4   // a fit could not be had
	exitInterrupted = 130 // 128 and the number of the interrupt signal, as shells report it
)

// exitMeanings is what the help says about the codes that the commands of this program end with.
var exitMeanings = []struct {
	code    int
	meaning string
}{
	{exitDone, "done; what the checks find does not change it"},
	{exitRequest, "the request or the input is wrong, or a file cannot be written; nothing was written, and a batch keeps what it had done"},
	{exitRegions, "a batch is done, with regions that failed or are not to be used"},
	{exitFit, "a fit could not be had; nothing was written"},
	{exitInterrupted, "interrupted; nothing was written, and a batch can be continued"},
}

// fitFailed is an error that says the request and the input are in order and still no fit came of them.
type fitFailed interface{ FitFailed() bool }

// exitCode maps what a command returned to the code the process ends with.
func exitCode(err error) int {
	var fit fitFailed
	var regions *incomplete
	switch {
	case err == nil:
		return exitDone
	case errors.Is(err, context.Canceled):
		return exitInterrupted
	case errors.As(err, &regions):
		return exitRegions
	case errors.As(err, &fit) && fit.FitFailed():
		return exitFit
	}
	return exitRequest
}
