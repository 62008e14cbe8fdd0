package spec

import (
	"embed"
	"fmt"
	"strings"
)

//go:embed samples/*.yaml
var sampleFiles embed.FS

// Sample is a commented model to start from.
type Sample struct {
	Name    string // a word
	Purpose string // one line
	Text    string // the model file
}

var samplePurposes = []Sample{
	{Name: "sail", Purpose: "a four-point sail with edge cables"},
	{Name: "cone", Purpose: "a high point with a ring, corners on masts with guys"},
	{Name: "arch", Purpose: "a vault on three arches"},
	{Name: "ridge", Purpose: "two fabrics with a ridge cable between them"},
	{Name: "net", Purpose: "an orthogonal cable net with edge cables"},
	{Name: "listed", Purpose: "nodes, members, supports and loads as tables"},
}

// Samples returns commented models of several kinds, the simplest first.
func Samples() []Sample {
	out := make([]Sample, len(samplePurposes))
	for i, s := range samplePurposes {
		b, err := sampleFiles.ReadFile("samples/" + s.Name + ".yaml")
		if err != nil {
			panic(fmt.Sprintf("spec: sample %q is not embedded", s.Name))
		}
		s.Text = strings.ReplaceAll(string(b), "\r\n", "\n")
		out[i] = s
	}
	return out
}
