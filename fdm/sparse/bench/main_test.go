package main

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// The checksums are those that CHOLMOD, Eigen and SciPy give for the same
// matrices: sums of the solution of an independent program each.
func TestReportMatchesIndependentSolvers(t *testing.T) {
	for _, c := range []struct {
		args     []string
		unknowns int
		checksum float64
	}{
		{[]string{"34", "quad", "1"}, 1024, 1095.73383848},
		{[]string{"34", "tri", "1"}, 1024, 1111.96477676},
		{[]string{"102", "quad", "1"}, 10000, 10756.9792032},
		{[]string{"-ldl", "102", "tri", "1"}, 10000, 10860.4670612},
	} {
		var out strings.Builder
		if err := run(c.args, &out); err != nil {
			t.Fatal(err)
		}
		var r report
		if err := json.Unmarshal([]byte(out.String()), &r); err != nil {
			t.Fatal(err)
		}
		if r.Unknowns != c.unknowns || math.Abs(r.Checksum/c.checksum-1) > 1e-11 || r.Backward > 1e-14 {
			t.Errorf("%v: %d unknowns, checksum %.12g, backward error %g", c.args, r.Unknowns, r.Checksum, r.Backward)
		}
	}
}

func TestNetsSolveToRounding(t *testing.T) {
	for _, name := range []string{"delaunay", "radial", "polar", "blocks"} {
		var out strings.Builder
		if err := run([]string{"42", name, "1"}, &out); err != nil {
			t.Fatal(err)
		}
		var r report
		if err := json.Unmarshal([]byte(out.String()), &r); err != nil {
			t.Fatal(err)
		}
		if !(r.Backward <= 1e-14) {
			t.Errorf("%s: backward error %g", name, r.Backward)
		}
	}
}

// Euler: a triangulation of points has 3n−3−h edges, h of them on the outline.
func TestDelaunayHasTheEdgesOfATriangulation(t *testing.T) {
	const n = 30 * 30
	edges := len(delaunayEdges(30))
	if hull := 3*n - 3 - edges; hull < 3 || hull > n/8 {
		t.Errorf("%d edges for %d points", edges, n)
	}
}

func TestDumpAndErrors(t *testing.T) {
	name := filepath.Join(t.TempDir(), "net.mtx")
	if err := run([]string{"-dump", name, "5", "quad", "1"}, nil); err != nil {
		t.Fatal(err)
	}
	text, err := os.ReadFile(name)
	if err != nil {
		t.Fatal(err)
	}
	// Nine free nodes and the twelve cables between them.
	if lines := strings.Split(strings.TrimSpace(string(text)), "\n"); len(lines) != 2+9+12 || lines[1] != "9 9 21" {
		t.Errorf("dump has %d lines, head %q", len(lines), lines[1])
	}
	for _, args := range [][]string{{}, {"2", "quad", "1"}, {"9", "cube", "1"}, {"9", "quad", "0"}, {"-order", "x", "9", "quad", "1"}} {
		if run(args, &strings.Builder{}) == nil {
			t.Errorf("%v passed", args)
		}
	}
}
