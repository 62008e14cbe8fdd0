package export

import (
	"bytes"
	"encoding/binary"
	"encoding/json"
	"io"
	"math"
	"strconv"
	"strings"
	"testing"

	"anticlast/formfind/canopy"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

// measured is what testdata/measure.py prints.
type measured struct {
	Points, Triangles int
	Area, Length      float64
	Lo, Hi            []float64
	PointData         map[string]json.RawMessage `json:"point_data"`
	CellData          map[string]json.RawMessage `json:"cell_data"`
	Layers            map[string]int
	Texts, Defined    []string
	Version           string
}

func measure(t *testing.T, reader, format string, results ...*canopy.Result) []measured {
	t.Helper()
	py := python(t, "numpy", reader)
	args := []string{"testdata/measure.py", reader}
	for _, r := range results {
		args = append(args, saved(t, format, r))
	}
	// Python writes NaN, which JSON does not know.
	dec := json.NewDecoder(strings.NewReader(strings.ReplaceAll(run(t, py, args...), "NaN", "null")))
	out := make([]measured, len(results))
	for i := range out {
		require.NoError(t, dec.Decode(&out[i]))
	}
	return out
}

// total is what r holds.
func total(r *canopy.Result) (area, length float64) {
	for i := range r.Structure.Corners {
		_, a := triangleNormal(r, i)
		area += a
	}
	for i := range r.Structure.Ends {
		length += memberLength(r, i)
	}
	return area, length
}

func requireBox(t *testing.T, m measured, r *canopy.Result, used []r3.Vec, within float64) {
	t.Helper()
	lo, hi := canopy.Bounds(used)
	require.InDeltaSlice(t, []float64{lo.X, lo.Y, lo.Z}, m.Lo, within)
	require.InDeltaSlice(t, []float64{hi.X, hi.Y, hi.Z}, m.Hi, within)
}

func TestOBJReadsBack(t *testing.T) {
	t.Parallel()
	all := []*canopy.Result{sail(9), cone(12), grid(5)}
	for i, m := range measure(t, "vtk", "obj", all...) {
		r := all[i]
		area, length := total(r)
		require.Equal(t, len(r.Form.Position), m.Points)
		require.Equal(t, len(r.Structure.Corners), m.Triangles)
		// The reader keeps single precision.
		single := 1e-6 * math.Max(1, r3.Norm(r.Form.Position[0]))
		require.InDelta(t, area, m.Area, 100*single)
		require.InDelta(t, length, m.Length, 100*single)
		requireBox(t, m, r, r.Form.Position, single)
	}
}

func TestSTLReadsBack(t *testing.T) {
	t.Parallel()
	r := sail(9)
	area, _ := total(r)
	for _, reader := range []string{"vtk", "meshio"} {
		m := measure(t, reader, "stl", r)[0]
		require.Equal(t, len(r.Structure.Corners), m.Triangles)
		require.InEpsilon(t, area, m.Area, 1e-6)
		requireBox(t, m, r, fabricPoints(r), 1e-6)
	}
	// Far from the origin the shape is kept relative to the origin in the header.
	r = cone(32)
	area, _ = total(r)
	require.InEpsilon(t, area, measure(t, "vtk", "stl", r)[0].Area, 1e-5)
	var b bytes.Buffer
	require.NoError(t, writeSTL(background, &b, r, Options{}))
	require.Contains(t, string(b.Bytes()[:80]), "Origin 432100 5712300 12")
	require.Equal(t, 84+50*len(r.Structure.Corners), b.Len())
	require.EqualValues(t, len(r.Structure.Corners), binary.LittleEndian.Uint32(b.Bytes()[80:]))
	require.ErrorIs(t, writeSTL(background, io.Discard, grid(4), Options{}), ErrNoFabric)
	require.ErrorIs(t, writePLY(background, io.Discard, grid(4), Options{}), ErrNoFabric)
}

func TestPLYReadsBack(t *testing.T) {
	t.Parallel()
	r := sail(9)
	area, _ := total(r)
	for reader, within := range map[string]float64{"vtk": 1e-6, "meshio": 1e-12} {
		m := measure(t, reader, "ply", r)[0]
		require.Equal(t, len(r.Form.Position), m.Points)
		require.Equal(t, len(r.Structure.Corners), m.Triangles)
		require.InEpsilon(t, area, m.Area, within)
		requireBox(t, m, r, r.Form.Position, within*10)
	}
}

func TestMeshesOpenElsewhere(t *testing.T) {
	t.Parallel()
	assimp := tool(t, "assimp")
	r := sail(9)
	for _, format := range []string{"glb", "obj", "stl", "ply"} {
		out := run(t, assimp, "info", saved(t, format, r))
		require.NotContains(t, out, "ERROR", format)
		switch format {
		case "glb":
			require.Contains(t, out, "(fabric sail, achieved): [100 / 0 / 162 | triangle]")
		case "stl", "ply":
			require.Contains(t, strings.Join(strings.Fields(out), " "), "Faces: "+strconv.Itoa(len(r.Structure.Corners)), format)
		}
	}
}

func TestDXFReadsBack(t *testing.T) {
	t.Parallel()
	r := sail(9)
	r.Structure.Cables[0].Name = "Süd 1"
	read := measure(t, "ezdxf", "dxf", r, cone(12), grid(5))
	m := read[0]
	area, length := total(r)
	require.Equal(t, "AC1009", m.Version)
	require.Equal(t, len(r.Structure.Corners), m.Triangles)
	require.InEpsilon(t, area, m.Area, 1e-10)
	require.InEpsilon(t, length, m.Length, 1e-10)
	requireBox(t, m, r, r.Form.Position, 1e-10)
	require.Equal(t, 4, m.Layers["edge_cable"])
	require.Equal(t, 1, m.Layers["mast"])
	require.Equal(t, 2, m.Layers["guy"])
	require.Equal(t, 6, m.Layers["anchor"])
	for layer := range m.Layers {
		require.Contains(t, m.Defined, layer)
	}
	all := strings.Join(m.Texts, "\n")
	require.Contains(t, all, "25.02 kN")
	require.Contains(t, all, "A: action 18.00 / 10.00 / 10.00 kN")
	require.Contains(t, all, "units m")
	require.Contains(t, all, canopy.Caution)
	require.Regexp(t, `S(ü|\\U\+00FC)d 1`, all)
	_, length = total(grid(5))
	require.InEpsilon(t, length, read[2].Length, 1e-10)
}

// Values are read back by two readers and compared with the form's.
func TestVTUReadsBack(t *testing.T) {
	t.Parallel()
	for _, reader := range []string{"vtk", "meshio"} {
		all := []*canopy.Result{sail(9), cone(12), grid(5)}
		for _, r := range all {
			for i := range r.Form.Warp { // into the triangles
				n, _ := triangleNormal(r, i)
				w := r.Form.Warp[i]
				r.Form.Warp[i] = r3.Unit(r3.Sub(w, r3.Scale(r3.Dot(w, n), n)))
			}
		}
		for i, m := range measure(t, reader, "vtu", all...) {
			r := all[i]
			s, f := r.Structure, r.Form
			area, length := total(r)
			require.Equal(t, len(f.Position), m.Points)
			require.Equal(t, len(s.Corners), m.Triangles)
			require.InDelta(t, area, m.Area, 1e-9*area)
			require.InDelta(t, length, m.Length, 1e-9*length)
			requireBox(t, m, r, f.Position, 0)
			var reaction [][3]float64
			require.NoError(t, json.Unmarshal(m.PointData["reaction"], &reaction))
			for i, v := range f.Reaction {
				require.Equal(t, [3]float64{v.X, v.Y, v.Z}, reaction[i])
			}
			// The forces of members and triangles, summed here, are what is out
			// of balance. A triangle pulls at a corner with −A·σ·∇φ, φ the linear
			// shape function of the corner (Zienkiewicz, The Finite Element
			// Method: nodal forces ∫Bᵀσ dA), here in the axes of the model.
			var residual [][3]float64
			require.NoError(t, json.Unmarshal(m.PointData["residual"], &residual))
			sum := make([]r3.Vec, len(f.Position))
			for k, c := range s.Corners {
				m, p := stressTensor(r, k), [3]r3.Vec{f.Position[c[0]], f.Position[c[1]], f.Position[c[2]]}
				n := r3.Cross(r3.Sub(p[1], p[0]), r3.Sub(p[2], p[0]))
				n = r3.Unit(n)
				for j, v := range c {
					g := r3.Scale(-0.5, r3.Cross(n, r3.Sub(p[(j+2)%3], p[(j+1)%3]))) // −A·∇φ
					sum[v] = r3.Add(sum[v], r3.Vec{X: m[0]*g.X + m[1]*g.Y + m[2]*g.Z, Y: m[3]*g.X + m[4]*g.Y + m[5]*g.Z, Z: m[6]*g.X + m[7]*g.Y + m[8]*g.Z})
				}
			}
			for k, e := range s.Ends {
				d := r3.Sub(f.Position[e[1]], f.Position[e[0]])
				d = r3.Scale(f.Force[k]/r3.Norm(d), d)
				sum[e[0]], sum[e[1]] = r3.Add(sum[e[0]], d), r3.Sub(sum[e[1]], d)
			}
			for i := range sum {
				sum[i] = r3.Add(sum[i], s.LoadAt(i))
				want := [3]float64{sum[i].X, sum[i].Y, sum[i].Z}
				for d := range 3 {
					if s.Fixed[i].Has(d) {
						require.Zero(t, residual[i][d], "node %d", i)
					} else {
						require.InDelta(t, want[d], residual[i][d], 1e-6, "node %d", i)
					}
				}
			}
			var force []*float64
			require.NoError(t, json.Unmarshal(m.CellData["force"], &force))
			for i, v := range f.Force {
				require.Equal(t, v, *force[len(s.Corners)+i])
			}
			var tensor []json.RawMessage
			require.NoError(t, json.Unmarshal(m.CellData["stress"], &tensor))
			for i := range s.Corners {
				var flat [9]float64
				var square [3][3]float64
				if json.Unmarshal(tensor[i], &flat) != nil {
					require.NoError(t, json.Unmarshal(tensor[i], &square))
					for k := range flat {
						flat[k] = square[k/3][k%3]
					}
				}
				require.Equal(t, stressTensor(r, i), flat)
				require.Nil(t, force[i])
			}
		}
	}
}

// The tensor has the stresses' invariants, no component across the sheet, and
// gives the warp stress back along the warp.
func TestStressTensor(t *testing.T) {
	r := sail(5)
	// The warp of the invented form is not exactly in the triangles.
	for i := range r.Form.Warp {
		n, _ := triangleNormal(r, i)
		w := r.Form.Warp[i]
		r.Form.Warp[i] = r3.Unit(r3.Sub(w, r3.Scale(r3.Dot(w, n), n)))
	}
	for i, s := range r.Form.Stress {
		m := stressTensor(r, i)
		times := func(v r3.Vec) r3.Vec {
			return r3.Vec{X: m[0]*v.X + m[1]*v.Y + m[2]*v.Z, Y: m[3]*v.X + m[4]*v.Y + m[5]*v.Z, Z: m[6]*v.X + m[7]*v.Y + m[8]*v.Z}
		}
		n, _ := triangleNormal(r, i)
		w := r.Form.Warp[i]
		require.InDelta(t, s.Warp+s.Weft, m[0]+m[4]+m[8], 1e-8)
		require.InDelta(t, 0, r3.Norm(times(n)), 1e-8)
		require.InDelta(t, s.Warp, r3.Dot(w, times(w)), 1e-8)
		require.InDelta(t, s.Shear, r3.Dot(r3.Cross(n, w), times(w)), 1e-8)
	}
}

func BenchmarkMeshFormats(b *testing.B) {
	r := sail(sweepN(100, 300, 700))
	for _, name := range []string{"obj", "stl", "ply", "dxf", "vtu"} {
		f, _ := Lookup(name)
		b.Run(name, func(b *testing.B) {
			for b.Loop() {
				var n counter
				if err := f.Write(background, &n, r, Options{}); err != nil {
					b.Fatal(err)
				}
				b.SetBytes(int64(n))
			}
		})
	}
}
