package main

import "golang.org/x/sys/unix"

// cpuSeconds is the processor time of the process so far.
func cpuSeconds() float64 {
	var t unix.Timespec
	if err := unix.ClockGettime(unix.CLOCK_PROCESS_CPUTIME_ID, &t); err != nil {
		return 0
	}
	return float64(t.Sec) + 1e-9*float64(t.Nsec)
}

// peakMB is the largest resident memory so far in MiB.
func peakMB() float64 {
	var u unix.Rusage
	if err := unix.Getrusage(unix.RUSAGE_SELF, &u); err != nil {
		return 0
	}
	return float64(u.Maxrss) / 1024
}
