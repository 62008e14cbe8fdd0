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
// shape-changing ones, as ‖r‖/‖s‖: a resolved surface of equal stress is within
// 3e-4 from a hundred triangles on; of unequal stress, whose magnitude is fitted,
// within 8e-3 (400 random canopies); cones between rings within 1e-3, and up to
// 2.5e-3 and 0.1 at a single node within 2 % of their height limit on fine meshes.
// Surfaces that only their mesh holds, cones taller than any cone can be, show
// 0.03 and 0.01 upwards, 0.3 at a node. What lies between is caught by
// unsettled.
const (
	pinnedEqual   = 0.01
	pinnedUnequal = 0.009
	pinnedNode    = 0.12   // at a single node
	pinnedHeld    = 0.0028 // unequal stress without edge cables that shear it
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
	case slices.Contains(s.Kind, canopy.KindEdgeCable):
		most = pinnedUnequal
	default:
		// A short neck hardly counts in the mean.
		if worst > pinnedNode {
			return true
		}
		most = pinnedHeld
	}
	return math.Sqrt(rr) > most*math.Sqrt(ss)
}

// unsettled says why a result is not to be relied on though every number of it
// balances: refining the mesh still moves the surface by more than discretisation
// of a resolved one ever does. Canopies that have a shape move by less than 1e-3
// of their size from a few hundred triangles on; a surface beyond the last real
// equilibrium, held by its mesh, moves by several times that.
func unsettled(a *canopy.Audit) string {
	if a.Discretisation > 2.5e-3 {
		return fmt.Sprintf("a finer mesh would move the surface by about %.2f %% of its size, too much for a shape that the forces hold: form it on a finer mesh, and ask whether it can exist at all", 100*a.Discretisation)
	}
	return ""
}
