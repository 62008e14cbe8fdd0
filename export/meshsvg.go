package export

import (
	"cmp"
	"context"
	"fmt"
	"io"
	"math"
	"slices"

	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

// MeshDrawing is what a drawing of a mesh shows beside it.
type MeshDrawing struct {
	Title     string
	Nodes     []int32 // named in the drawing
	Triangles []int32 // shaded: those that are doubtful
}

// MeshSVG writes a drawing of the mesh of a structure at its positions: as seen
// from above, or from the side where it stands upright. Cables, fixed lines,
// supports and what d asks for are marked.
func MeshSVG(ctx context.Context, w io.Writer, s *canopy.Structure, d MeshDrawing) error {
	p, side := flatView(s)
	lo, hi := [2]float64{math.Inf(1), math.Inf(1)}, [2]float64{math.Inf(-1), math.Inf(-1)}
	for _, q := range p {
		for k := range 2 {
			lo[k], hi[k] = min(lo[k], q[k]), max(hi[k], q[k])
		}
	}
	if len(p) == 0 {
		lo, hi = [2]float64{}, [2]float64{1, 1}
	}
	width, height := hi[0]-lo[0], hi[1]-lo[1]
	scale := (paperWidth - 2*paperMargin) / max(width, height, 1e-9)
	left := (paperWidth - scale*width) / 2
	const top = 84.0
	page := top + scale*height + paperMargin
	at := func(i int32) (x, y string) {
		return px(left + scale*(p[i][0]-lo[0])), px(top + scale*(hi[1]-p[i][1]))
	}
	t := newText(ctx, w)
	t.printf("<svg xmlns=\"http://www.w3.org/2000/svg\" viewBox=\"0 0 %.0f %.0f\" width=\"%.0f\" height=\"%.0f\" font-family=\"%s\">\n", paperWidth, page, paperWidth, page, fontFamily)
	t.str("<title>").str(escape(oneLine(d.Title))).str("</title>\n<desc>").str(escape(canopy.Caution)).str("</desc>\n")
	t.str("<style>" + drawingStyle + ".mesh{stroke:#8d9aa5;stroke-width:.6}.poor{fill:#e8a33d}</style>\n")
	t.printf("<rect width=\"%.0f\" height=\"%.0f\" fill=\"#fff\"/>\n", paperWidth, page)
	t.printf("<text x=\"24\" y=\"36\" font-size=\"22\" class=\"ink\">%s</text>\n", escape(oneLine(d.Title)))
	t.printf("<text x=\"24\" y=\"58\" font-size=\"12\" class=\"faint\">Mesh before solving, %s: %d nodes, %d members, %d triangles</text>\n", side, len(s.Position), len(s.Ends), len(s.Corners))

	path := func(class string, each func(move func(i int32), line func(i int32))) bool {
		t.str("<path class=\"").str(class).str("\" d=\"")
		n := 0
		to := func(c string) func(int32) {
			return func(i int32) {
				x, y := at(i)
				t.str(c).str(x).str(" ").str(y)
				if n++; n%64 == 0 {
					t.line()
				}
			}
		}
		each(to("M"), to("L"))
		t.str("\"/>")
		return t.line()
	}
	if len(d.Triangles) > 0 {
		path("poor", func(move, line func(int32)) {
			for _, k := range d.Triangles {
				c := s.Corners[k]
				move(c[0])
				line(c[1])
				line(c[2])
				t.str("Z")
			}
		})
	}
	path("l mesh", func(move, line func(int32)) {
		for _, e := range triangleSides(s) {
			move(e[0])
			line(e[1])
		}
	})
	for _, l := range s.Lines {
		class := "l fixed\" stroke-width=\"2.4"
		if l.Role == "seam" {
			class = "l seam"
		}
		path(class, func(move, line func(int32)) {
			for k, i := range l.Nodes {
				if k == 0 {
					move(i)
				} else {
					line(i)
				}
			}
		})
	}
	for k, e := range s.Ends {
		class := "l cable\" stroke-width=\"2"
		switch s.Kind[k] {
		case canopy.KindMast, canopy.KindStrut:
			class = "l mast\" stroke-width=\"3"
		case canopy.KindNetCable:
			class = "l cable\" stroke-width=\"0.8"
		}
		if !path(class, func(move, line func(int32)) { move(e[0]); line(e[1]) }) {
			break
		}
	}
	named := map[int32]bool{}
	for _, i := range d.Nodes {
		named[i] = true
	}
	for i := range p {
		f := s.FixedAt(i)
		if f == 0 || len(p) > 200 && f == canopy.DirAll && !named[int32(i)] {
			continue // nodes along fixed lines would make a band
		}
		x, y := at(int32(i))
		class := "foot"
		if s.Held != nil && s.Held[i] != 0 {
			class = "held"
		}
		t.printf("<circle class=\"%s\" cx=\"%s\" cy=\"%s\" r=\"4\"/>", class, x, y)
		t.line()
	}
	for _, i := range d.Nodes {
		x, y := at(i)
		t.printf("<text class=\"ink label\" x=\"%s\" y=\"%s\" dx=\"7\" dy=\"-6\" font-size=\"%.0f\">%s</text>", x, y, letters, escape(s.NodeName.At(int(i))))
		t.line()
	}
	m := roundLength(0.25 * max(width, height, 1e-9))
	y := page - 30
	t.printf("<path class=\"dim\" d=\"M24 %sv-6M24 %sh%sv-6\"/><text class=\"faint\" x=\"%s\" y=\"%s\" font-size=\"12\">%s m</text>\n",
		px(y), px(y), px(scale*m), px(30+scale*m), px(y), fmt.Sprint(m))
	t.str("</svg>\n")
	return t.close()
}

// flatView projects the nodes of a structure: from above, or along x or y where
// most of it stands upright.
func flatView(s *canopy.Structure) (p [][2]float64, side string) {
	var area r3.Vec
	for _, c := range s.Corners {
		n := r3.Cross(r3.Sub(s.Position[c[1]], s.Position[c[0]]), r3.Sub(s.Position[c[2]], s.Position[c[0]]))
		area = r3.Add(area, r3.Vec{X: math.Abs(n.X), Y: math.Abs(n.Y), Z: math.Abs(n.Z)})
	}
	p = make([][2]float64, len(s.Position))
	side = "from above"
	if upright := max(area.X, area.Y); area.Z < 0.2*upright {
		side = "from −y"
		if area.X > area.Y {
			side = "from +x"
		}
	}
	for i, v := range s.Position {
		switch side {
		case "from above":
			p[i] = [2]float64{v.X, v.Y}
		case "from −y":
			p[i] = [2]float64{v.X, v.Z}
		default:
			p[i] = [2]float64{v.Y, v.Z}
		}
	}
	return p, side
}

// triangleSides lists the sides of all triangles, each once.
func triangleSides(s *canopy.Structure) [][2]int32 {
	out := make([][2]int32, 0, 3*len(s.Corners))
	for _, c := range s.Corners {
		for k := range 3 {
			a, b := c[k], c[(k+1)%3]
			out = append(out, [2]int32{min(a, b), max(a, b)})
		}
	}
	slices.SortFunc(out, func(p, q [2]int32) int {
		return cmp.Or(cmp.Compare(p[0], q[0]), cmp.Compare(p[1], q[1]))
	})
	return slices.Compact(out)
}
