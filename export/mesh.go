package export

import (
	"context"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
	"strings"

	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

// ErrNoFabric is returned by formats that hold surfaces only when the result
// has none.
var ErrNoFabric = errors.New("the result has no fabric, and this format holds surfaces only")

// fineDigits keeps coordinates of a national grid to a micrometre.
const fineDigits = 14

// writeOBJ writes the mesh as Wavefront OBJ: a group of faces per fabric and a
// line element per cable or member. Vertices are the nodes, z is up.
func writeOBJ(ctx context.Context, w io.Writer, r *canopy.Result, _ Options) error {
	s, f := r.Structure, r.Form
	t := newText(ctx, w)
	t.str("# ").str(oneLine(r.Title)).line()
	t.str("# ").str(canopy.Caution).line()
	t.str("# units: m, z up; vertices are the nodes in order").line()
	for _, p := range f.Position {
		t.str("v ").num(p.X, fineDigits).str(" ").num(p.Y, fineDigits).str(" ").num(p.Z, fineDigits)
		if !t.line() {
			break
		}
	}
	for i := range s.Fabrics {
		started := false
		for k, c := range s.Corners {
			if int(s.FabricOf[k]) != i {
				continue
			}
			if !started {
				started = true
				t.str("g ").str(identifier("fabric " + s.Fabrics[i].Name)).line()
			}
			t.str("f ").int(int(c[0]) + 1).str(" ").int(int(c[1]) + 1).str(" ").int(int(c[2]) + 1)
			if !t.line() {
				break
			}
		}
	}
	chains, loose := chainsAndMembers(s)
	for _, i := range chains {
		c := &s.Cables[i]
		t.str("g ").str(identifier(label(c.Kind.String(), c.Name))).line()
		t.str("l")
		for _, v := range c.Nodes {
			t.str(" ").int(int(v) + 1)
		}
		if !t.line() {
			break
		}
	}
	last := canopy.Kind(255)
	for _, i := range loose {
		if s.Kind[i] != last {
			last = s.Kind[i]
			t.str("g ").str(identifier(last.String())).line()
		}
		t.str("l ").int(int(s.Ends[i][0]) + 1).str(" ").int(int(s.Ends[i][1]) + 1)
		if !t.line() {
			break
		}
	}
	return t.close()
}

// identifier makes one word of a name.
func identifier(s string) string { return strings.ReplaceAll(oneLine(s), " ", "_") }

// chainsAndMembers lists the cables that have members, and the members that are
// in none of them.
func chainsAndMembers(s *canopy.Structure) (chains []int, loose []int) {
	drawn := make([]bool, len(s.Ends))
	for i := range s.Cables {
		if len(s.Cables[i].Members) > 0 {
			chains = append(chains, i)
			for _, m := range s.Cables[i].Members {
				drawn[m] = true
			}
		}
	}
	for i := range s.Ends {
		if !drawn[i] {
			loose = append(loose, i)
		}
	}
	return chains, loose
}

// localOrigin is what is taken off coordinates for formats of single precision:
// zero unless they are large against the model.
func localOrigin(r *canopy.Result) r3.Vec {
	lo, hi := canopy.Bounds(r.Form.Position)
	centre := r3.Scale(0.5, r3.Add(lo, hi))
	if r3.Norm(centre) <= 20*r3.Norm(r3.Sub(hi, lo)) {
		return r3.Vec{}
	}
	return r3.Vec{X: math.Round(centre.X), Y: math.Round(centre.Y), Z: math.Round(lo.Z)}
}

// writeSTL writes the fabric as binary STL, for printers and mesh tools. The
// format has single precision and no place for units: its header says m and,
// when coordinates are relative to one, the local origin.
func writeSTL(ctx context.Context, w io.Writer, r *canopy.Result, _ Options) error {
	s, f := r.Structure, r.Form
	if len(s.Corners) == 0 {
		return ErrNoFabric
	}
	origin := localOrigin(r)
	header := "units m, z up. Preliminary design only, not a structural verification."
	if origin != (r3.Vec{}) {
		header = fmt.Sprintf("units m, z up. Preliminary design only. Origin %.0f %.0f %.0f", origin.X, origin.Y, origin.Z)
	}
	t := newText(ctx, w)
	t.b = append(t.b, header[:min(len(header), 80)]...)
	for len(t.b) < 80 {
		t.b = append(t.b, ' ')
	}
	t.b = binary.LittleEndian.AppendUint32(t.b, uint32(len(s.Corners)))
	for i, c := range s.Corners {
		normal, _ := triangleNormal(r, i)
		for _, v := range []r3.Vec{normal, r3.Sub(f.Position[c[0]], origin), r3.Sub(f.Position[c[1]], origin), r3.Sub(f.Position[c[2]], origin)} {
			t.float32s(v.X, v.Y, v.Z)
		}
		t.b = append(t.b, 0, 0)
		if !t.more() {
			break
		}
	}
	return t.close()
}

func (t *text) float32s(v ...float64) {
	for _, x := range v {
		t.b = binary.LittleEndian.AppendUint32(t.b, math.Float32bits(float32(x)))
	}
}

func (t *text) float64s(v ...float64) {
	for _, x := range v {
		t.b = binary.LittleEndian.AppendUint64(t.b, math.Float64bits(x))
	}
}

// more writes out what has gathered, without ending a line.
func (t *text) more() bool {
	if len(t.b) >= full {
		t.flush()
	}
	return t.err == nil
}

// writePLY writes the fabric as binary PLY with the nodes in double precision
// and the colours of the default layer.
func writePLY(ctx context.Context, w io.Writer, r *canopy.Result, _ Options) error {
	s, f := r.Structure, r.Form
	if len(s.Corners) == 0 {
		return ErrNoFabric
	}
	shown := layers(r)[0]
	sum, weight := make([]float64, len(f.Position)), make([]float64, len(f.Position))
	for i, c := range s.Corners {
		_, area := triangleNormal(r, i)
		if v := shown.value(i); !math.IsNaN(v) && !math.IsInf(v, 0) {
			for _, k := range c {
				sum[k] += area * v
				weight[k] += area
			}
		}
	}
	t := newText(ctx, w)
	t.str("ply\nformat binary_little_endian 1.0\n")
	t.str("comment ").str(oneLine(r.Title)).str("\n")
	t.str("comment ").str(canopy.Caution).str("\n")
	t.str("comment units m, z up; colour: ").str(shown.title).str("\n")
	t.printf("element vertex %d\nproperty double x\nproperty double y\nproperty double z\n", len(f.Position))
	t.str("property uchar red\nproperty uchar green\nproperty uchar blue\n")
	t.printf("element face %d\nproperty list uchar int vertex_indices\nend_header\n", len(s.Corners))
	for i, p := range f.Position {
		t.float64s(p.X, p.Y, p.Z)
		c := shown.colour(sum[i] / weight[i]).srgb()
		t.b = append(t.b, c[0], c[1], c[2])
		if !t.more() {
			break
		}
	}
	for _, c := range s.Corners {
		t.b = append(t.b, 3)
		for _, v := range c {
			t.b = binary.LittleEndian.AppendUint32(t.b, uint32(v))
		}
		if !t.more() {
			break
		}
	}
	return t.close()
}
