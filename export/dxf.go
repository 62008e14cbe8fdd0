package export

import (
	"context"
	"fmt"
	"io"
	"slices"
	"strings"

	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

// writeDXF writes a drawing in the text form of DXF release 12, which every CAD
// program reads: fabric as 3DFACE, chains of cable as 3D polylines, other
// members as lines, supports as points, names and forces as text, each kind of
// thing on its layer. Release 12 has no flag for units: a comment and a text
// say metres.
func writeDXF(ctx context.Context, w io.Writer, r *canopy.Result, _ Options) error {
	s, f := r.Structure, r.Form
	d := &dxf{text: newText(ctx, w)}
	lo, hi := canopy.Bounds(f.Position)
	height := 0.012 * r3.Norm(r3.Sub(hi, lo)) // of letters
	if height == 0 {
		height = 0.1
	}
	d.header(lo, hi, r)

	for i, c := range s.Corners {
		d.entity("3DFACE", "fabric")
		for k, v := range [4]int32{c[0], c[1], c[2], c[2]} {
			d.point(k, f.Position[v])
		}
		if i%1000 == 0 && d.err != nil {
			break
		}
	}
	chains, loose := chainsAndMembers(s)
	for _, i := range chains {
		c := &s.Cables[i]
		layer := dxfLayer(c.Kind)
		if len(c.Members) == 1 {
			d.entity("LINE", layer)
			d.point(0, f.Position[c.Nodes[0]])
			d.point(1, f.Position[c.Nodes[1]])
		} else {
			d.polyline(layer, c.Nodes, f.Position)
		}
		middle := c.Members[len(c.Members)/2]
		force := 0.0
		for _, m := range c.Members {
			force += f.Force[m] / float64(len(c.Members))
		}
		e := s.Ends[middle]
		at := r3.Scale(0.5, r3.Add(f.Position[e[0]], f.Position[e[1]]))
		d.label(at, height, fmt.Sprintf("%s %s kN", oneLine(c.Name), kN(force)))
	}
	for _, i := range loose {
		d.entity("LINE", dxfLayer(s.Kind[i]))
		d.point(0, f.Position[s.Ends[i][0]])
		d.point(1, f.Position[s.Ends[i][1]])
		if d.err != nil {
			break
		}
	}
	for i := range s.Lines {
		if l := &s.Lines[i]; l.Role != "seam" && len(l.Nodes) > 1 {
			d.polyline("fixed_line", l.Nodes, f.Position)
		}
	}
	for i := range s.Rings {
		if g := &s.Rings[i]; g.Rigid && len(g.Nodes) > 2 {
			d.polyline("ring", append(slices.Clone(g.Nodes), g.Nodes[0]), f.Position)
		}
	}
	for i, fixed := range s.Fixed {
		if fixed == 0 {
			continue
		}
		d.entity("POINT", "anchor")
		d.point(0, f.Position[i])
		if len(s.NodeName.Bytes(i)) > 0 {
			v := f.Reaction[i]
			d.label(f.Position[i], height, fmt.Sprintf("%s: action %s / %s / %s kN", oneLine(s.NodeName.At(i)), kN(-v.X), kN(-v.Y), kN(-v.Z)))
		}
		if d.err != nil {
			break
		}
	}
	below := func(k float64) r3.Vec { return r3.Vec{X: lo.X, Y: lo.Y - k*height, Z: lo.Z} }
	d.label(below(3), height, oneLine(r.Title)+" - units m, forces kN (action = on the foundation, x / y / z)")
	d.label(below(5), height, canopy.Caution)
	d.pair(0, "ENDSEC")
	d.pair(0, "EOF")
	return d.close()
}

// dxfLayers are the layers with their colour numbers.
var dxfLayers = []struct {
	name   string
	colour int
}{
	{"fabric", 9}, {"cable", 5}, {"edge_cable", 5}, {"ridge_cable", 1}, {"valley_cable", 3}, {"net_cable", 8},
	{"ring_cable", 6}, {"guy", 4}, {"mast", 7}, {"strut", 7}, {"ring", 6}, {"fixed_line", 30}, {"anchor", 2}, {"text", 7},
}

func dxfLayer(k canopy.Kind) string { return strings.ReplaceAll(k.String(), " ", "_") }

type dxf struct{ *text }

// pair writes a group code and its value, a line each.
func (d *dxf) pair(code int, value string) {
	d.int(code)
	d.line()
	d.str(value)
	d.line()
}

func (d *dxf) real(code int, v float64) {
	d.int(code)
	d.line()
	d.num(v, fineDigits)
	d.line()
}

// point writes the k-th point of an entity.
func (d *dxf) point(k int, p r3.Vec) {
	d.real(10+k, p.X)
	d.real(20+k, p.Y)
	d.real(30+k, p.Z)
}

func (d *dxf) entity(kind, layer string) {
	d.pair(0, kind)
	d.pair(8, layer)
}

func (d *dxf) header(lo, hi r3.Vec, r *canopy.Result) {
	d.pair(999, "units: metres; forces in texts: kN; z up")
	d.pair(999, dxfText(canopy.Caution))
	d.pair(999, dxfText(r.Title))
	d.pair(0, "SECTION")
	d.pair(2, "HEADER")
	d.pair(9, "$ACADVER")
	d.pair(1, "AC1009")
	d.pair(9, "$EXTMIN")
	d.point(0, lo)
	d.pair(9, "$EXTMAX")
	d.point(0, hi)
	d.pair(0, "ENDSEC")
	d.pair(0, "SECTION")
	d.pair(2, "TABLES")
	d.pair(0, "TABLE")
	d.pair(2, "LTYPE")
	d.pair(70, "1")
	d.pair(0, "LTYPE")
	d.pair(2, "CONTINUOUS")
	d.pair(70, "0")
	d.pair(3, "solid line")
	d.pair(72, "65")
	d.pair(73, "0")
	d.real(40, 0)
	d.pair(0, "ENDTAB")
	d.pair(0, "TABLE")
	d.pair(2, "LAYER")
	d.pair(70, fmt.Sprint(len(dxfLayers)))
	for _, l := range dxfLayers {
		d.pair(0, "LAYER")
		d.pair(2, l.name)
		d.pair(70, "0")
		d.pair(62, fmt.Sprint(l.colour))
		d.pair(6, "CONTINUOUS")
	}
	d.pair(0, "ENDTAB")
	d.pair(0, "ENDSEC")
	d.pair(0, "SECTION")
	d.pair(2, "ENTITIES")
}

// polyline writes a 3D polyline, closed when it ends where it began.
func (d *dxf) polyline(layer string, nodes []int32, position []r3.Vec) {
	flag := "8" // 3D
	if len(nodes) > 3 && nodes[0] == nodes[len(nodes)-1] {
		flag, nodes = "9", nodes[:len(nodes)-1]
	}
	d.entity("POLYLINE", layer)
	d.pair(66, "1")
	d.point(0, r3.Vec{})
	d.pair(70, flag)
	for _, v := range nodes {
		d.entity("VERTEX", layer)
		d.point(0, position[v])
		d.pair(70, "32")
	}
	d.entity("SEQEND", layer)
}

func (d *dxf) label(at r3.Vec, height float64, s string) {
	d.entity("TEXT", "text")
	d.point(0, at)
	d.real(40, height)
	d.pair(1, dxfText(s))
}

// dxfText writes what is not ASCII as \U+XXXX and drops control characters.
func dxfText(s string) string {
	var b strings.Builder
	for _, r := range oneLine(s) {
		switch {
		case r >= ' ' && r < 0x7f:
			b.WriteRune(r)
		case r >= 0xa0 && r <= 0xffff:
			fmt.Fprintf(&b, "\\U+%04X", r)
		default:
			b.WriteByte('?')
		}
	}
	return b.String()
}
