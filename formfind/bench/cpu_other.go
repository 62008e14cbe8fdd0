//go:build !linux

package main

import "time"

var began = time.Now()

// processorSeconds is the time since the start where the processor time is not
// known.
func processorSeconds() float64 { return time.Since(began).Seconds() }
