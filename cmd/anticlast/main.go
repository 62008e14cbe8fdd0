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
	"runtime/debug"
	"syscall"
)

// collectLazily lets the heap grow to five times what lives before it is
// collected: a canopy of ordinary size then needs no collection at all. Models
// with much to hold go back to the usual factor (see form), and whoever sets
// GOGC decides.
func collectLazily() {
	if os.Getenv("GOGC") == "" {
		debug.SetGCPercent(400)
	}
}

// collectEagerly is for models of this many nodes and more.
func collectEagerly(nodes int) {
	if nodes > 200_000 && os.Getenv("GOGC") == "" {
		debug.SetGCPercent(100)
	}
}

func main() {
	collectLazily()
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	// After the first signal the default action is back, so that a second
	// one ends a program that does not come to a stop.
	go func() {
		<-ctx.Done()
		stop()
	}()
	os.Exit(Run(ctx, os.Args[1:], systemStreams()))
}
