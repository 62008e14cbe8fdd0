package main

import "golang.org/x/sys/unix"

// processorSeconds is the processor time of the process so far.
func processorSeconds() float64 {
	var t unix.Timespec
	if err := unix.ClockGettime(unix.CLOCK_PROCESS_CPUTIME_ID, &t); err != nil {
		return 0
	}
	return float64(t.Sec) + 1e-9*float64(t.Nsec)
}
