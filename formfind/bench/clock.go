package main

import "time"

// clock measures seconds of processor time, of all processors together, and by the
// clock on the wall.
type clock struct {
	processor float64
	wall      time.Time
}

func startClock() clock { return clock{processorSeconds(), time.Now()} }

// read returns the seconds since the start.
func (c clock) read() (processor, wall float64) {
	return processorSeconds() - c.processor, time.Since(c.wall).Seconds()
}
