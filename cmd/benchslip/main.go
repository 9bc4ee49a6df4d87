// Command benchslip turns bench recordings into judged numbers and a slip.
package main

import (
	"context"
	"os"
	"os/signal"
)

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt)
	context.AfterFunc(ctx, stop) // a second interrupt ends the program at once
	status := Run(ctx, os.Args[1:], os.Stdin, os.Stdout, os.Stderr)
	os.Exit(status)
}
