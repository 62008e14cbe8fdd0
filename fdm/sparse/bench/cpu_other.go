//go:build !linux

package main

import (
	"runtime"
	"time"
)

var start = time.Now()

// cpuSeconds is the time since the start where the processor time is not known.
func cpuSeconds() float64 { return time.Since(start).Seconds() }

// peakMB is the memory obtained from the system in MiB.
func peakMB() float64 {
	var m runtime.MemStats
	runtime.ReadMemStats(&m)
	return float64(m.Sys) / (1 << 20)
}
