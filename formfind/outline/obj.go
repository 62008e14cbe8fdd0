package outline

import (
	"bufio"
	"io"
	"strconv"
	"strings"

	"gonum.org/v1/gonum/spatial/r3"
)

// ReadOBJ reads the polygons of an OBJ mesh: the statements v and f. A polygon
// of more than three corners is divided: one of four along its shorter diagonal,
// others from their first corner. Everything else in the file is left out. What
// is wrong in it is in Surface.Faults; the error is one of reading r.
func ReadOBJ(r io.Reader) (*Surface, error) {
	s := &Surface{}
	in := bufio.NewScanner(r)
	in.Buffer(make([]byte, 0, 4096), longest)
	line := 0
	for in.Scan() {
		line++
		text := in.Text()
		start := line
		for strings.HasSuffix(text, `\`) && len(text) < longest && in.Scan() {
			line++
			text = text[:len(text)-1] + " " + in.Text()
		}
		f := strings.Fields(text)
		if len(f) == 0 {
			continue
		}
		switch f[0] {
		case "v":
			s.vertex(f[1:], start)
		case "f":
			s.polygon(f[1:], start)
		}
		if len(s.Vertex) > 3*maxTriangles || len(s.Triangle) > maxTriangles {
			s.fail(start, "", "the mesh has more than %d triangles", maxTriangles)
			return s, nil
		}
		if len(s.Faults) >= maxFaults {
			return s, nil
		}
	}
	if err := in.Err(); err == bufio.ErrTooLong {
		s.fail(line+1, "the file is damaged, or not an OBJ mesh", "a line is longer than %d bytes", longest)
	} else if err != nil {
		return s, err
	}
	if len(s.Triangle) == 0 && len(s.Faults) == 0 {
		s.fail(0, "", "the mesh has no triangles")
	}
	return s, nil
}

// vertex adds a vertex of three coordinates; more (weights, colours) are left out.
func (s *Surface) vertex(f []string, line int) {
	var c [3]float64
	if len(f) < 3 {
		s.fail(line, "", "a vertex has %d coordinates", len(f))
		return
	}
	for k := range 3 {
		v, err := strconv.ParseFloat(f[k], 64)
		if err != nil || !usable(v) {
			s.fail(line, "", "not a usable coordinate: %q", short(f[k]))
			return
		}
		c[k] = v
	}
	s.Vertex = append(s.Vertex, r3.Vec{X: c[0], Y: c[1], Z: c[2]})
}

func (s *Surface) polygon(f []string, line int) {
	v := make([]int32, 0, len(f))
	for _, w := range f {
		w, _, _ = strings.Cut(w, "/")
		i, err := strconv.Atoi(w)
		if i < 0 {
			i += len(s.Vertex) + 1
		}
		if err != nil || i < 1 || i > len(s.Vertex) {
			s.fail(line, "vertices come before the faces that use them", "there is no vertex %q", short(w))
			return
		}
		v = append(v, int32(i-1))
	}
	if len(v) < 3 {
		s.fail(line, "", "a face has %d corners", len(v))
		return
	}
	if len(v) == 4 {
		p := func(k int) r3.Vec { return s.Vertex[v[k]] }
		if apart3(p(1), p(3)) < apart3(p(0), p(2)) {
			v = []int32{v[1], v[2], v[3], v[0]}
		}
	}
	for k := 2; k < len(v); k++ {
		s.Triangle = append(s.Triangle, [3]int32{v[0], v[k-1], v[k]})
		s.Line = append(s.Line, int32(line))
	}
}
