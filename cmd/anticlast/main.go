// Command anticlast finds the equilibrium shape of a prestressed canopy from a
// boundary and a prestress, proves that it balances, and writes it for others.
//
//	anticlast form MODEL
//
// finds and writes everything in one go; see anticlast --help for the rest.
package main

import (
	"context"
	"os"
	"os/signal"
	"syscall"
)

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	// After the first signal the default action is back, so that a second
	// one ends a program that does not come to a stop.
	go func() {
		<-ctx.Done()
		stop()
	}()
	os.Exit(Run(ctx, os.Args[1:], systemStreams()))
}
