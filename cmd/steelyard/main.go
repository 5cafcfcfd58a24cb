// Command steelyard weighs one object by its hot gas, by the light it bends and
// by the motions of its galaxies, and says whether the masses agree.
package main

import (
	"context"
	"os"
	"os/signal"
	"syscall"
)

func main() {
	ctx, interrupt := context.WithCancel(context.Background())
	signals := make(chan os.Signal, 2)
	signal.Notify(signals, os.Interrupt, syscall.SIGTERM)
	go func() {
		<-signals
		interrupt()
		<-signals
		os.Exit(exitFailed) // a second interrupt ends the program at once
	}()
	os.Exit(run(ctx, os.Args[1:], os.Stdout, os.Stderr))
}
