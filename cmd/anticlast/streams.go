package main

import (
	"io"
	"os"

	"golang.org/x/term"
)

// Streams is all a command knows of the world around it. Tests replace it.
type Streams struct {
	In  io.Reader
	Out io.Writer
	Err io.Writer
	// Terminal says that Err is a terminal: progress may be drawn on it.
	Terminal bool
	// Colour says that Out is a terminal that wants colour.
	Colour bool
	// Width of the terminal in columns; 0 when Out is none.
	Width int
}

func systemStreams() Streams {
	s := Streams{In: os.Stdin, Out: os.Stdout, Err: os.Stderr}
	s.Terminal = term.IsTerminal(int(os.Stderr.Fd())) && os.Getenv("TERM") != "dumb"
	if fd := int(os.Stdout.Fd()); term.IsTerminal(fd) {
		_, no := os.LookupEnv("NO_COLOR")
		s.Colour = !no && os.Getenv("TERM") != "dumb"
		if w, _, err := term.GetSize(fd); err == nil {
			s.Width = w
		}
	}
	return s
}
