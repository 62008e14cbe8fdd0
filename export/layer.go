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
	reach   float64   // |value − 1| or value at the end of the scale
	values  []float64 // per triangle
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

// layers computes what can be shown in colour on the fabric of r.
func layers(r *canopy.Result) []layer {
	s, f := r.Structure, r.Form
	n := len(s.Corners)
	if n == 0 {
		return nil
	}
	warp, weft := make([]float64, n), make([]float64, n)
	rel, worse := make([]float64, n), make([]float64, n)
	tilt, used := make([]float64, n), make([]float64, n)
	utilised := false
	for i, got := range f.Stress {
		want := s.Stress[i]
		warp[i], weft[i] = ratio(got.Warp, want[0]), ratio(got.Weft, want[1])
		rel[i] = ratio(warp[i], weft[i])
		// The one that is farther from 1.
		worse[i] = warp[i]
		if math.IsNaN(worse[i]) || math.Abs(weft[i]-1) > math.Abs(warp[i]-1) {
			worse[i] = weft[i]
		}
		normal, _ := triangleNormal(r, i)
		tilt[i] = degrees(slope(normal))
		used[i] = fabricUtilisation(r, i)
		utilised = utilised || used[i] > 0
	}
	reach := deviationReach(warp, weft)
	all := []layer{
		{layerAchieved, "prestress achieved/specified, the worse of warp and weft", true, reach, worse},
		{layerWarp, "warp prestress achieved/specified", true, reach, warp},
		{layerWeft, "weft prestress achieved/specified", true, reach, weft},
		{layerRatio, "(warp:weft)/nominal", true, deviationReach(rel), rel},
	}
	if utilised {
		all = append(all, layer{layerUtilisation, "utilisation, prestress only", false, 1, used})
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
func deviationReach(values ...[]float64) float64 {
	most := 0.0
	for _, v := range values {
		for _, x := range v {
			if d := math.Abs(x - 1); d > most && !math.IsInf(d, 0) {
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
func (m *sheetMesh) atVertices(r *canopy.Result, values []float64) []float64 {
	sum, weight := make([]float64, len(m.node)), make([]float64, len(m.node))
	for k, t := range m.triangle {
		v := values[t]
		if math.IsNaN(v) || math.IsInf(v, 0) {
			continue
		}
		for _, c := range m.corners[k] {
			sum[c] += m.area[k] * v
			weight[c] += m.area[k]
		}
	}
	for i := range sum {
		sum[i] /= weight[i] // NaN where nothing is known
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
}

// sheets splits the triangles by fabric. Vertices come in the order of first
// use, triangles in that of the structure; triangles without area are left out.
func sheets(r *canopy.Result) []sheetMesh {
	s := r.Structure
	out := make([]sheetMesh, len(s.Fabrics))
	vertex := make([]int32, len(s.Position)) // of the current fabric
	byFabric := make([][]int32, len(s.Fabrics))
	for i, f := range s.FabricOf {
		byFabric[f] = append(byFabric[f], int32(i))
	}
	for f := range out {
		m := &out[f]
		for i := range vertex {
			vertex[i] = -1
		}
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
