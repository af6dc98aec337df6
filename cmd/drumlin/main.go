// Drumlin makes maps, with standard errors, out of scattered field observations.
package main

import (
	"context"
	"os"
	"os/signal"
	"syscall"
)

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	// The first signal asks for an orderly end. From then on the signals act as usual, so that a second one kills.
	context.AfterFunc(ctx, stop)
	code := run(ctx, os.Args, os.Stdin, os.Stdout, os.Stderr)
	stop()
	os.Exit(code)
}
