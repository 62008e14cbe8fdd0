package outline

import (
	"bufio"
	"bytes"
	"encoding/binary"
	"fmt"
	"io"
	"math"
	"strings"

	"gonum.org/v1/gonum/spatial/r3"
)

// ReadSTL reads an STL mesh, ASCII or binary. Every triangle comes with its own
// corners, which [Surface.Settle] joins. What is wrong in the file is in
// Surface.Faults; the error is one of reading r.
func ReadSTL(r io.Reader) (*Surface, error) {
	in := bufio.NewReaderSize(r, 1<<16)
	head, err := in.Peek(512)
	if err != nil && err != io.EOF {
		return &Surface{}, err
	}
	// Binary files may start with the word solid, too, but hold other bytes.
	if bytes.HasPrefix(bytes.TrimLeft(head, " \t\r\n"), []byte("solid")) && bytes.IndexByte(head, 0) < 0 {
		return asciiSTL(in)
	}
	return binarySTL(in)
}

func asciiSTL(r io.Reader) (*Surface, error) {
	s := &Surface{}
	in := bufio.NewScanner(r)
	in.Buffer(make([]byte, 0, 4096), longest)
	line, from, ended, start := 0, -1, false, 0
	for in.Scan() {
		line++
		f := strings.Fields(in.Text())
		if len(f) == 0 {
			continue
		}
		switch strings.ToLower(f[0]) {
		case "solid", "endloop":
		case "endsolid":
			ended = true
		case "facet":
			from, start = len(s.Vertex), line
		case "outer":
		case "vertex":
			if from < 0 {
				s.fail(line, "", "a vertex outside a facet")
				return s, nil
			}
			n := len(s.Vertex)
			if s.vertex(f[1:], line); len(s.Vertex) == n {
				return s, nil
			}
		case "endfacet":
			if from < 0 || len(s.Vertex)-from != 3 {
				s.fail(start, "", "a facet has %d vertices", len(s.Vertex)-max(from, 0))
				return s, nil
			}
			v := int32(from)
			s.Triangle = append(s.Triangle, [3]int32{v, v + 1, v + 2})
			s.Line = append(s.Line, int32(start))
			from = -1
		default:
			s.fail(line, "the file is damaged, or not an STL mesh", "unknown word %q", short(f[0]))
			return s, nil
		}
		if len(s.Triangle) > maxTriangles || len(s.Vertex) > 3*maxTriangles {
			s.fail(line, "", "the mesh has more than %d triangles", maxTriangles)
			return s, nil
		}
	}
	if err := in.Err(); err == bufio.ErrTooLong {
		s.fail(line+1, "the file is damaged, or not an STL mesh", "a line is longer than %d bytes", longest)
	} else if err != nil {
		return s, err
	}
	switch {
	case len(s.Faults) > 0:
	case !ended:
		s.fail(line, "the file is cut off", "the mesh ends without endsolid")
	case len(s.Triangle) == 0:
		s.fail(0, "", "the mesh has no triangles")
	}
	return s, nil
}

func binarySTL(r io.Reader) (*Surface, error) {
	s := &Surface{}
	var head [84]byte
	if _, err := io.ReadFull(r, head[:]); err == io.EOF || err == io.ErrUnexpectedEOF {
		s.fail(0, "", "the file is not an STL mesh: it is shorter than 84 bytes")
		return s, nil
	} else if err != nil {
		return s, err
	}
	n := binary.LittleEndian.Uint32(head[80:])
	if n > maxTriangles {
		s.fail(0, "the file is damaged, or not an STL mesh", "the file says that it has %d triangles, more than %d", n, maxTriangles)
		return s, nil
	}
	var facet [50]byte
	for t := range n {
		if _, err := io.ReadFull(r, facet[:]); err == io.EOF || err == io.ErrUnexpectedEOF {
			s.fail(0, "the file is cut off, or not an STL mesh", "the file says that it has %d triangles and ends after %d", n, t)
			return s, nil
		} else if err != nil {
			return s, err
		}
		for k := range 3 {
			c := func(i int) float64 {
				return float64(math.Float32frombits(binary.LittleEndian.Uint32(facet[12+12*k+4*i:])))
			}
			v := r3.Vec{X: c(0), Y: c(1), Z: c(2)}
			if !usable(v.X, v.Y, v.Z) {
				s.fail(0, "the file is damaged", "triangle %d has a coordinate that is not usable: %s", t+1, fmt.Sprint(v))
				return s, nil
			}
			s.Vertex = append(s.Vertex, v)
		}
		v := int32(3 * t)
		s.Triangle = append(s.Triangle, [3]int32{v, v + 1, v + 2})
		s.Line = append(s.Line, 0)
	}
	if n == 0 {
		s.fail(0, "", "the mesh has no triangles")
	}
	return s, nil
}
