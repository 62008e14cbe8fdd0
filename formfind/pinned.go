package formfind

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/formfind/canopy"
)

// unreal reports whether a shape found on a mesh is none that a surface could
// have.
func unreal(s *canopy.Structure, f *canopy.Form) bool { return pinned(s, f) || closedCorner(s, f) }

// How far from balance in all directions a shape may be that balances in the
// shape-changing ones, as ‖r‖/‖s‖ over the nodes and at a single node.
//
// Resolved surfaces: a node carries of a stress that is out of balance in the
// surface by div S about |div S|·h², of forces of about S·h that meet there, h the
// side of a triangle. Equal stress and cones between rings can balance exactly; what
// is left is discretisation, h times h². Seen: 3e-3 for equal stress on two hundred
// triangles near a limit, 1e-4 and falling eightfold with h halved for cones, at a
// node 1e-3. Other unequal stress cannot, and ‖r‖/‖s‖ falls as h: 0.07·h/L at most for
// sails held all round at warp:weft 3:1 as steep as they exist, L the size.
//
// Surfaces that only their mesh holds, cones taller than any cone can be, show
// 6e-4 upwards on any mesh and, since it is a few triangles that hold, 0.04 upwards
// at one node; of equal stress 0.03 and 0.1. Without edge cables nothing else does.
// Cables shear the fabric bonded to them, most at the corners: 400 random canopies
// show 8e-3, and 0.12 at a node. What passes and still does not come to rest on finer
// meshes is found out there (refined.go).
const (
	pinnedEqual   = 0.01
	pinnedUnequal = 0.009 // unequal stress with edge cables
	pinnedNode    = 0.03  // at a single node, unequal stress held all round
	pinnedHeld    = 0.1   // by h/L: the stress out of balance by a tenth of itself over the size
	pinnedBlown   = 0.2   // the same under pressure: 0.13 in a hall of 2:1 until its walls are upright
)

// pinned reports whether a shape in balance along its normals is far from balance
// in its plane. Beyond the last real equilibrium a neck cannot close on a mesh
// whose nodes move along their normals only: it draws out triangles until it
// hangs on them. No smooth surface is near such a shape.
func pinned(s *canopy.Structure, f *canopy.Form) bool {
	sum, size := nodalForces(s, f)
	sum = gather(s, sum)
	rr, ss, worst := 0.0, 0.0, 0.0
	for i, r := range sum {
		free := canopy.DirAll &^ s.FixedAt(i)
		if free == 0 || s.MasterOf(i) >= 0 {
			continue
		}
		rr += r3.Norm2(only(r, free))
		ss += size[i] * size[i]
		worst = max(worst, r3.Norm(only(r, free))/size[i])
	}
	most := pinnedEqual
	switch {
	case equalStress(s):
	case sheared(s):
		most = pinnedUnequal
	default:
		// A short neck hardly counts in the mean.
		if worst > pinnedNode {
			return true
		}
		most = pinnedHeld
		if blownUp(s) {
			most = pinnedBlown
		}
		most *= meshSide(s, f) / s.Size()
	}
	return math.Sqrt(rr) > most*math.Sqrt(ss)
}

// sheared reports whether edge cables shear fabric of unequal stress. In its plane
// such fabric is out of balance whatever the magnitude, most at the corners and where
// the outline does not let it hold the ratio, so that no threshold tells for certain a
// shape that the mesh holds: a walk or a finer mesh may stop at one as if at a limit.
func sheared(s *canopy.Structure) bool {
	return !equalStress(s) && slices.Contains(s.Kind, canopy.KindEdgeCable)
}

// blownUp reports whether pressure acts on the fabric, given or found.
func blownUp(s *canopy.Structure) bool {
	return len(s.Enclosures) > 0 || slices.ContainsFunc(s.Fabrics, func(f canopy.Fabric) bool { return f.Pressure != 0 })
}

// meshSide is the side of a typical triangle, m.
func meshSide(s *canopy.Structure, f *canopy.Form) float64 {
	area := 0.0
	for _, c := range s.Corners {
		area += r3.Norm(r3.Cross(r3.Sub(f.Position[c[1]], f.Position[c[0]]), r3.Sub(f.Position[c[2]], f.Position[c[0]]))) / 2
	}
	return math.Sqrt(2 * area / float64(max(1, len(s.Corners))))
}

// unsettled says why a result is not to be relied on though every number of it
// balances: the mesh is so coarse that it does not show the shape. What is coarser than
// one would like, but comes to rest on finer meshes, is told with its estimate.
func unsettled(a *canopy.Audit) string {
	if a.Discretisation > 0.05 {
		return fmt.Sprintf("a finer mesh would move the surface by about %.2g %% of its size: form it on a finer mesh", 100*a.Discretisation)
	}
	return ""
}
