package export

import (
	"math"

	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

// A layer is a value of the fabric that is shown in colour.
type layer struct {
	name  string // "achieved", "warp", …
	title string // with the unit
	// centred layers are shown around 1 on two hues, others from 0 on one.
	centred bool
	reach   float64             // |value − 1| or value at the end of the scale
	value   func(t int) float64 // of triangle t
}

// colour of a value of the layer.
func (l *layer) colour(v float64) rgb {
	if l.centred {
		return deviationColour((v - 1) / l.reach)
	}
	return shareColour(v / l.reach)
}

// Names of the layers in the order of listings. The first is the default.
const (
	layerAchieved    = "achieved"
	layerWarp        = "warp"
	layerWeft        = "weft"
	layerRatio       = "ratio"
	layerUtilisation = "utilisation"
	layerSlope       = "slope"
)

// layers tells what can be shown in colour on the fabric of r.
func layers(r *canopy.Result) []layer {
	s, f := r.Structure, r.Form
	n := len(s.Corners)
	if n == 0 {
		return nil
	}
	warp := func(i int) float64 { return ratio(f.Stress[i].Warp, s.Stress[i][0]) }
	weft := func(i int) float64 { return ratio(f.Stress[i].Weft, s.Stress[i][1]) }
	rel := func(i int) float64 { return ratio(warp(i), weft(i)) }
	worse := func(i int) float64 { // the one that is farther from 1
		a, b := warp(i), weft(i)
		if math.IsNaN(a) || math.Abs(b-1) > math.Abs(a-1) {
			return b
		}
		return a
	}
	tilt := func(i int) float64 {
		normal, _ := triangleNormal(r, i)
		return degrees(slope(normal))
	}
	used := func(i int) float64 { return fabricUtilisation(r, i) }
	reach := deviationReach(n, warp, weft)
	all := []layer{
		{layerAchieved, "prestress achieved/specified, the worse of warp and weft", true, reach, worse},
		{layerWarp, "warp prestress achieved/specified", true, reach, warp},
		{layerWeft, "weft prestress achieved/specified", true, reach, weft},
		{layerRatio, "(warp:weft)/nominal", true, deviationReach(n, rel), rel},
	}
	for i := range n {
		if used(i) > 0 {
			all = append(all, layer{layerUtilisation, "utilisation, prestress only", false, 1, used})
			break
		}
	}
	return append(all, layer{layerSlope, "slope, degrees", false, 90, tilt})
}

// fabricUtilisation is the larger of γ·σ/(f/γM) in warp and weft under prestress
// only, 0 when strengths or factors are not given.
func fabricUtilisation(r *canopy.Result, i int) float64 {
	f := &r.Structure.Fabrics[r.Structure.FabricOf[i]]
	if r.Factors.Load == 0 || r.Factors.Fabric == 0 {
		return 0
	}
	u := 0.0
	if f.WarpStrength > 0 {
		u = max(u, r.Factors.Load*r.Form.Stress[i].Warp*r.Factors.Fabric/f.WarpStrength)
	}
	if f.WeftStrength > 0 {
		u = max(u, r.Factors.Load*r.Form.Stress[i].Weft*r.Factors.Fabric/f.WeftStrength)
	}
	return u
}

// deviationReach is the end of a scale around 1: a round number that no value
// passes, at least 5 % so that noise does not look like news, at most 50 %.
func deviationReach(n int, values ...func(i int) float64) float64 {
	most := 0.0
	for _, v := range values {
		for i := range n {
			if d := math.Abs(v(i) - 1); d > most && !math.IsInf(d, 0) {
				most = d
			}
		}
	}
	for _, reach := range []float64{0.05, 0.1, 0.2} {
		if most <= reach {
			return reach
		}
	}
	return 0.5
}

// atVertices averages values of triangles at the vertices of a sheet, weighted
// by area. Values that are not known are left out.
func (m *sheetMesh) atVertices(value func(t int) float64) []float64 {
	sum, weight := make([]float64, len(m.node)), make([]float64, len(m.node))
	whole := int32(len(m.node) - len(m.twin))
	for k, t := range m.triangle {
		v := value(int(t))
		if math.IsNaN(v) || math.IsInf(v, 0) {
			continue
		}
		for _, c := range m.corners[k] {
			if c >= whole {
				c = m.twin[c-whole]
			}
			sum[c] += m.area[k] * v
			weight[c] += m.area[k]
		}
	}
	for i := range sum {
		sum[i] /= weight[i] // NaN where nothing is known
	}
	for i, c := range m.twin {
		sum[whole+int32(i)] = sum[c]
	}
	return sum
}

// sheetMesh is one fabric as a mesh with vertices of its own.
type sheetMesh struct {
	node     []int32    // node of each vertex
	normal   []r3.Vec   // unit normal of each vertex
	triangle []int32    // triangle of the structure
	corners  [][3]int32 // its vertices
	area     []float64
	// twin are the vertices of which the last ones are copies: along a cut the
	// sheet has two vertices at one node, see [sheetMesh.cut].
	twin []int32
}

// sheets splits the triangles by fabric. Vertices come in the order of first
// use, triangles in that of the structure; triangles without area are left out.
func sheets(r *canopy.Result) []sheetMesh {
	s := r.Structure
	out := make([]sheetMesh, len(s.Fabrics))
	vertex := make([]int32, len(s.Position)) // of the current fabric
	byFabric := make([][]int32, len(s.Fabrics))
	count := make([]int, len(s.Fabrics))
	for _, f := range s.FabricOf {
		count[f]++
	}
	for f, n := range count {
		byFabric[f] = make([]int32, 0, n)
	}
	for i, f := range s.FabricOf {
		byFabric[f] = append(byFabric[f], int32(i))
	}
	for f := range out {
		m := &out[f]
		m.triangle, m.corners, m.area = make([]int32, 0, count[f]), make([][3]int32, 0, count[f]), make([]float64, 0, count[f])
		for i := range vertex {
			vertex[i] = -1
		}
		vertices := 0
		for _, t := range byFabric[f] {
			for _, node := range s.Corners[t] {
				if vertex[node] == -1 {
					vertex[node] = -2 // counted
					vertices++
				}
			}
		}
		m.node, m.normal = make([]int32, 0, vertices), make([]r3.Vec, 0, vertices)
		for _, t := range byFabric[f] {
			normal, area := triangleNormal(r, int(t))
			if area == 0 {
				continue
			}
			var corners [3]int32
			for k, node := range s.Corners[t] {
				if vertex[node] < 0 {
					vertex[node] = int32(len(m.node))
					m.node = append(m.node, node)
					m.normal = append(m.normal, r3.Vec{})
				}
				corners[k] = vertex[node]
				m.normal[vertex[node]] = r3.Add(m.normal[vertex[node]], r3.Scale(area, normal))
			}
			m.triangle = append(m.triangle, t)
			m.corners = append(m.corners, corners)
			m.area = append(m.area, area)
		}
		for i, n := range m.normal {
			if l := r3.Norm(n); l > 0 {
				m.normal[i] = r3.Scale(1/l, n)
			} else {
				m.normal[i] = r3.Vec{Z: 1}
			}
		}
	}
	return out
}
