// Speedtrail compares two revisions of route speed data by what they mean for
// the trains, records the result in an append-only ledger and writes change
// reports. See README.md, or run it with --help.
package main

import (
	"context"
	"os"
	"os/signal"
	"syscall"
)

func main() {
	os.Exit(interruptible(os.Args[1:]))
}

// interruptible runs the command so that a first Ctrl-C or SIGTERM ends it in
// good order, and a second one at once.
func interruptible(args []string) int {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	defer stop()
	context.AfterFunc(ctx, stop) // the next signal has its ordinary effect again
	return run(ctx, args, os.Stdin, os.Stdout, os.Stderr)
}
