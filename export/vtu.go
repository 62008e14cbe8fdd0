package export

import (
	"context"
	"encoding/base64"
	"encoding/binary"
	"encoding/xml"
	"io"
	"math"
	"strings"

	"anticlast/formfind/audit"
	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

// writeVTU writes an unstructured grid in the XML format of VTK: fabric as
// triangles, then members as lines, with every value an engineer may want to
// look at. Values that a cell does not have are NaN. SI units, z up.
//
// The stress of a triangle is a symmetric tensor in the axes of the model, N/m
// of width: σ = σ₁w⊗w + σ₂f⊗f + τ(w⊗f + f⊗w) with unit warp w and weft f.
func writeVTU(ctx context.Context, w io.Writer, r *canopy.Result, _ Options) error {
	s, f := r.Structure, r.Form
	triangles, members := len(s.Corners), len(s.Ends)
	cells := triangles + members
	v := &vtu{newText(ctx, w)}
	v.str(`<?xml version="1.0" encoding="UTF-8"?>` + "\n<!-- ")
	v.str(comment(canopy.Caution + " " + r.Title)).str(" -->\n")
	v.str("<!-- SI units: m, N, N/m of width; tension positive; z up. Reaction is the force of the support on the structure. -->\n")
	v.str(`<VTKFile type="UnstructuredGrid" version="1.0" byte_order="LittleEndian" header_type="UInt64">` + "\n<UnstructuredGrid>\n")
	v.printf("<Piece NumberOfPoints=\"%d\" NumberOfCells=\"%d\">\n", len(f.Position), cells)

	v.str("<Points>\n")
	v.vectors("position", len(f.Position), func(i int) r3.Vec { return f.Position[i] })
	v.str("</Points>\n<Cells>\n")
	v.ints("Int64", "connectivity", 3*triangles+2*members, func(i int) int64 {
		if i < 3*triangles {
			return int64(s.Corners[i/3][i%3])
		}
		i -= 3 * triangles
		return int64(s.Ends[i/2][i%2])
	})
	v.ints("Int64", "offsets", cells, func(i int) int64 {
		if i < triangles {
			return int64(3 * (i + 1))
		}
		return int64(3*triangles + 2*(i-triangles+1))
	})
	v.ints("UInt8", "types", cells, func(i int) int64 {
		if i < triangles {
			return 5 // triangle
		}
		return 3 // line
	})
	v.str("</Cells>\n<PointData>\n")
	v.vectors("reaction", len(f.Position), func(i int) r3.Vec { return f.Reaction[i] })
	residual := audit.Residuals(s, f)
	v.vectors("residual", len(f.Position), func(i int) r3.Vec { return residual[i] })
	v.vectors("load", len(f.Position), func(i int) r3.Vec { return s.LoadAt(i) })
	v.ints("UInt8", "supported", len(f.Position), func(i int) int64 { return int64(s.Fixed[i]) })
	v.str("</PointData>\n<CellData>\n")

	// A value of triangles and one of members; nil = none.
	value := func(name string, ofTriangle, ofMember func(i int) float64) {
		v.floats(name, 1, cells, func(i int, out []float64) {
			out[0] = math.NaN()
			if i < triangles {
				if ofTriangle != nil {
					out[0] = ofTriangle(i)
				}
			} else if ofMember != nil {
				out[0] = ofMember(i - triangles)
			}
		})
	}
	v.floats("stress", 9, cells, func(i int, out []float64) {
		if i >= triangles {
			for k := range out {
				out[k] = math.NaN()
			}
			return
		}
		t := stressTensor(r, i)
		copy(out, t[:])
	})
	v.vectors("warp", cells, func(i int) r3.Vec {
		if i < triangles {
			return f.Warp[i]
		}
		return r3.Vec{}
	})
	value("warp_stress", func(i int) float64 { return f.Stress[i].Warp }, nil)
	value("weft_stress", func(i int) float64 { return f.Stress[i].Weft }, nil)
	value("shear_stress", func(i int) float64 { return f.Stress[i].Shear }, nil)
	value("major_principal", func(i int) float64 { a, _ := principal(f.Stress[i]); return a }, nil)
	value("minor_principal", func(i int) float64 { _, b := principal(f.Stress[i]); return b }, nil)
	value("warp_achieved_over_specified", func(i int) float64 { return ratio(f.Stress[i].Warp, s.Stress[i][0]) }, nil)
	value("weft_achieved_over_specified", func(i int) float64 { return ratio(f.Stress[i].Weft, s.Stress[i][1]) }, nil)
	value("force", nil, func(i int) float64 { return f.Force[i] })
	value("force_density", nil, func(i int) float64 { return ratio(f.Force[i], memberLength(r, i)) })
	v.ints("Int32", "kind", cells, func(i int) int64 {
		if i < triangles {
			return -1
		}
		return int64(s.Kind[i-triangles])
	})
	v.ints("Int32", "fabric", cells, func(i int) int64 {
		if i < triangles {
			return int64(s.FabricOf[i])
		}
		return -1
	})
	v.str("</CellData>\n</Piece>\n</UnstructuredGrid>\n</VTKFile>\n")
	return v.close()
}

// stressTensor is the stress of triangle i in the model's axes, row by row.
func stressTensor(r *canopy.Result, i int) [9]float64 {
	normal, _ := triangleNormal(r, i)
	w := r.Form.Warp[i]
	f := r3.Cross(normal, w)
	s := r.Form.Stress[i]
	a, b := [3]float64{w.X, w.Y, w.Z}, [3]float64{f.X, f.Y, f.Z}
	var t [9]float64
	for j := range 3 {
		for k := range 3 {
			t[3*j+k] = s.Warp*a[j]*a[k] + s.Weft*b[j]*b[k] + s.Shear*(a[j]*b[k]+b[j]*a[k])
		}
	}
	return t
}

// comment makes s fit for an XML comment.
func comment(s string) string {
	var b strings.Builder
	_ = xml.EscapeText(&b, []byte(oneLine(s)))
	return strings.ReplaceAll(b.String(), "--", "- -")
}

type vtu struct{ *text }

// array writes a data array: base64 of the number of bytes and the bytes.
func (v *vtu) array(kind, name string, components, bytes, n int, put func(b []byte, i int) []byte) {
	v.printf("<DataArray type=%q Name=%q", kind, name)
	if components > 1 {
		v.printf(" NumberOfComponents=\"%d\"", components)
	}
	v.str(" format=\"binary\">")
	raw := binary.LittleEndian.AppendUint64(nil, uint64(n*components*bytes))
	for i := range n {
		raw = put(raw, i)
		// Three bytes are four letters: encode in whole groups.
		if len(raw) >= full {
			whole := len(raw) / 3 * 3
			v.b = base64.StdEncoding.AppendEncode(v.b, raw[:whole])
			raw = raw[:copy(raw, raw[whole:])]
			if !v.more() {
				return
			}
		}
	}
	v.b = base64.StdEncoding.AppendEncode(v.b, raw)
	v.str("</DataArray>\n")
	v.more()
}

func (v *vtu) floats(name string, components, n int, put func(i int, out []float64)) {
	out := make([]float64, components)
	v.array("Float64", name, components, 8, n, func(b []byte, i int) []byte {
		put(i, out)
		for _, x := range out {
			b = binary.LittleEndian.AppendUint64(b, math.Float64bits(x))
		}
		return b
	})
}

func (v *vtu) vectors(name string, n int, at func(i int) r3.Vec) {
	v.floats(name, 3, n, func(i int, out []float64) { p := at(i); out[0], out[1], out[2] = p.X, p.Y, p.Z })
}

func (v *vtu) ints(kind, name string, n int, at func(i int) int64) {
	bytes := map[string]int{"UInt8": 1, "Int32": 4, "Int64": 8}[kind]
	v.array(kind, name, 1, bytes, n, func(b []byte, i int) []byte {
		x := at(i)
		switch bytes {
		case 1:
			return append(b, byte(x))
		case 4:
			return binary.LittleEndian.AppendUint32(b, uint32(x))
		}
		return binary.LittleEndian.AppendUint64(b, uint64(x))
	})
}
