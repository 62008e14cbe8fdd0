package limit

import (
	"fmt"
	"math"
	"strings"

	"anticlast/formfind/canopy"
)

// equalMesh is what is known of one equal-mesh net.
type equalMesh struct {
	name           string
	unstressed     float64 // m, of every mesh
	meshes, ends   int
	length         float64 // m, all links without stress
	endLength      float64 // m, those cut to fit
	least, most    float64 // N
	nodes          map[int32]bool
	slack          list
	uneven, cannot bool
}

// equalMeshes reports, for nets whose links between crossings all have one
// length without stress, the cable that they take: what is ordered and marked.
func (c *check) equalMeshes() {
	s := c.s
	if len(s.Group) != len(s.Ends) || len(s.Unstressed) != len(s.Ends) || len(s.Stiffness) != len(s.Ends) {
		return
	}
	var nets []*equalMesh
	of := map[string]*equalMesh{}
	each := func(do func(n *equalMesh, k int)) {
		for k := range s.Ends {
			if s.Kind[k] != canopy.KindNetCable {
				continue
			}
			name, _, ok := strings.Cut(s.Groups[s.Group[k]], "/")
			if !ok {
				continue
			}
			n := of[name]
			if n == nil {
				n = &equalMesh{name: name, least: math.Inf(1), nodes: map[int32]bool{}}
				of[name] = n
				nets = append(nets, n)
			}
			do(n, k)
		}
	}
	each(func(n *equalMesh, k int) {
		t := c.f.Force[k]
		n.least, n.most = min(n.least, t), max(n.most, t)
		if s.Law[k] == canopy.LawElastic {
			l := s.Unstressed[k]
			if n.meshes == 0 {
				n.unstressed = l
			}
			n.uneven = n.uneven || math.Abs(l-n.unstressed) > 1e-9*n.unstressed
			n.meshes++
			n.length += l
			n.nodes[s.Ends[k][0]], n.nodes[s.Ends[k][1]] = true, true
			if !(t > 0) {
				n.slack.add(k, -t, 0)
			}
			return
		}
		if !(s.Stiffness[k] > 0) {
			n.cannot = true
			return
		}
		l := c.length(int32(k)) / (1 + t/s.Stiffness[k])
		n.ends++
		n.length += l
		n.endLength += l
	})
	for _, n := range nets {
		if n.meshes == 0 || n.uneven || n.cannot {
			continue
		}
		f := canopy.Finding{ID: "equal-mesh", Severity: canopy.Note, Source: SourceModel, Value: n.length, Count: 1,
			Text: fmt.Sprintf("Net %s takes %.1f m of cable, measured without stress: %s of %.4f m each between %s, and %.1f m in %s cut to fit at the boundary; forces %s to %s.",
				n.name, n.length, plural(n.meshes, "mesh side", "mesh sides"), n.unstressed, plural(len(n.nodes), "crossing", "crossings"),
				n.endLength, plural(n.ends, "end piece", "end pieces"), kN(n.least), kN(n.most))}
		if len(n.slack.at) > 0 {
			f.Severity, f.Value, f.Count = canopy.Broken, n.least, len(n.slack.at)
			f.Places = n.slack.places(c.member)
			f.Text = fmt.Sprintf("Net %s cannot have equal meshes as it is drawn: %s slack. The surface curves more than such a net can follow: give shorter meshes, turn its direction, lower the high points or strengthen the edge cables.",
				n.name, plural(len(n.slack.at), "mesh side is", "mesh sides are"))
		}
		c.add(f)
	}
}
