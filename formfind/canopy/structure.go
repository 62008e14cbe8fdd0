package canopy

import "gonum.org/v1/gonum/spatial/r3"

// Freedom is a set of directions of a node, one bit each for x, y and z.
type Freedom uint8

// Directions of a node.
const (
	DirX   Freedom = 1 << iota // along x
	DirY                       // along y
	DirZ                       // along z
	DirAll Freedom = DirX | DirY | DirZ
)

// Has reports whether direction d (0 = x, 1 = y, 2 = z) is in the set.
func (f Freedom) Has(d int) bool { return f>>uint(d)&1 != 0 }

// Kind says what part a member plays in a canopy, in the words of the trade.
type Kind uint8

// Kinds of member.
const (
	KindCable       Kind = iota // a cable with no more special role
	KindEdgeCable               // bounds a fabric or a net
	KindRidgeCable              // high line inside a canopy
	KindValleyCable             // low line inside a canopy
	KindNetCable                // one link of a cable net
	KindRingCable               // closes a cable ring around a high or low point
	KindGuy                     // stays a mast head or a corner
	KindMast                    // carries compression to the ground or to a cable
	KindStrut                   // any other member that may push
)

var kindNames = [...]string{"cable", "edge cable", "ridge cable", "valley cable", "net cable", "ring cable", "guy", "mast", "strut"}

// String gives the trade's word for the kind.
func (k Kind) String() string {
	if int(k) < len(kindNames) {
		return kindNames[k]
	}
	return "unknown"
}

// ParseKind is the inverse of [Kind.String].
func ParseKind(s string) (Kind, bool) {
	for i, n := range kindNames {
		if n == s {
			return Kind(i), true
		}
	}
	return 0, false
}

// Pushes reports whether a member of this kind may be in compression.
func (k Kind) Pushes() bool { return k == KindMast || k == KindStrut }

// Law says what decides the force of a member.
type Law uint8

// Laws of a member.
const (
	// LawForceDensity: force = Given · length, Given in N/m (force density).
	LawForceDensity Law = iota
	// LawForce: force = Given, in N, whatever the length.
	LawForce
	// LawElastic: force = Stiffness·(length − Unstressed)/Unstressed, with
	// Stiffness = EA in N and Unstressed in m. A kind that may not push is
	// slack (zero force) when shorter than Unstressed.
	LawElastic
	// LawCable: the member is part of a [Cable] whose own law decides one
	// force common to all its members; Given is a starting guess in N
	// (0 = none).
	LawCable
)

// CableLaw says what decides the common force of a cable.
type CableLaw uint8

// Laws of a cable.
const (
	// CablePerMember: each member follows its own Law. The cable only
	// orders its members for reports.
	CablePerMember CableLaw = iota
	// CableSag: the common force is found so that sag/chord = Value, where
	// sag is the largest distance of a node of the cable from its chord.
	CableSag
	// CableLength: the common force is found so that the sum of the member
	// lengths = Value, in m (a mast of given length, a guy cut to length).
	CableLength
	// CableElastic: common force = Stiffness·(L − Unstressed)/Unstressed with L
	// the sum of the member lengths: an elastic cable that slides freely
	// along what it bounds.
	CableElastic
	// CableBalance: the force is found afterwards, so that the held points
	// at its ends are in balance. Engines leave such members out.
	CableBalance
)

// Cable is an ordered chain of members. Masts and guys are cables of one
// member. Edge cables, ridge cables, valley cables, rings of cable and the
// lines of a net are chains.
type Cable struct {
	Name    string
	Kind    Kind
	Members []int32 // in order from one end to the other
	Nodes   []int32 // in the same order, one more than Members
	Law     CableLaw
	Value   float64 // sag ratio (–) or length (m), by Law
	// Stiffness (EA, N) and Unstressed length (m) of the whole cable for
	// CableElastic.
	Stiffness, Unstressed float64
}

// Fabric is one piece of fabric: what all of its triangles have in common.
type Fabric struct {
	Name string
	// Elastic makes stress follow strain from Structure.Reference; without
	// it the stress of each triangle is the given prestress.
	Elastic bool
	// Moduli in N/m of width and Poisson's ratio. PoissonWarpWeft is the
	// contraction in weft caused by stress in warp; symmetry then asks for
	// ν_weft,warp = ν_warp,weft · WeftModulus / WarpModulus. Zero moduli: not given.
	WarpModulus, WeftModulus, ShearModulus, PoissonWarpWeft float64
	// Characteristic strip strength in N/m of width, 0 = not given.
	WarpStrength, WeftStrength float64
	Weight                     float64 // self weight, N/m²; 0 = none
	// Pressure is the internal pressure (follower) towards the positive side of
	// its triangles, Pa. Of the fabrics of an [Enclosure] it is found: in a
	// Result it is the one found, before that it counts for nothing.
	Pressure float64
	// WarpRule is how the warp was laid, so that a finer mesh can lay it
	// anew; WarpAxis (unit) and WarpCentre are the axis of the ring for
	// WarpRadial and WarpAround.
	WarpRule             WarpRule
	WarpAxis, WarpCentre r3.Vec
}

// Ring is the ring of a high or low point.
//
// The nodes of a rigid ring are tied to its centre (Structure.Master), and it is
// the centre that is supported, held or free in each direction, so that one
// reaction is reported there. Only a rigid ring that is anchored in all
// directions with nothing else at its centre is a row of supports: its nodes are
// Fixed and react one by one, and none is tied. The nodes of a cable ring move
// each for itself in the directions of Free and are Fixed in the others.
type Ring struct {
	Name   string
	Centre int32   // node at the centre
	Nodes  []int32 // around the ring, in order
	Rigid  bool    // rigid: the nodes keep their offsets from the centre
	// Free are the directions in which a rigid ring may move as one piece
	// (its rotation is always restrained by what carries it), or in which
	// each node of a cable ring may move.
	Free   Freedom
	Weight float64 // N, acts at the centre of a rigid ring
	Cable  int32   // index of the ring cable in Structure.Cables, −1 if rigid
}

// Line is an ordered line of nodes of which a report is wanted: a fixed edge,
// an arch, a seam.
type Line struct {
	Name  string
	Role  string // "fixed edge", "arch", "seam"
	Nodes []int32
}

// Curve is a boundary curve on which nodes sit, so that a finer mesh can put
// its new nodes back on it. A straight line from Start to End or, when Arc is
// set, the circular arc from Start to End through Through.
type Curve struct {
	Name                string
	Start, Through, End r3.Vec
	Arc                 bool
}

// Structure is what engines solve: flat arrays of plain numbers. All slices
// over nodes have len(Position), over members len(Ends), over triangles
// len(Corners), unless documented as optional (nil).
type Structure struct {
	// Nodes.
	Position []r3.Vec  // m; the place of a fixed node, a starting guess for a free one
	Fixed    []Freedom // directions in which a support holds the node and may react
	// Held (optional) are directions in which the position is given by the
	// designer but no support reacts: CableBalance members must
	// balance the node. Engines keep such nodes in place.
	Held []Freedom
	Load []r3.Vec // dead load, N; optional
	// Master (optional): for a node tied to a rigid ring the index of the
	// ring's centre node, −1 otherwise. A tied node moves with its master in
	// the directions in which it is not Fixed, and its forces act
	// on the master.
	Master   []int32
	NodeName Names // may be empty: then nodes are called by their number

	// Boundary curves of nodes, for refinement. Optional.
	Curves  []Curve
	OnCurve []int32   // index into Curves or −1
	Param   []float64 // position along the curve, 0 at Start, 1 at End, by arc length

	// Members.
	Ends       [][2]int32
	Kind       []Kind
	Law        []Law
	Given      []float64 // N/m or N, by Law
	Stiffness  []float64 // EA, N; optional, 0 = none
	Unstressed []float64 // m; optional, 0 = none
	Weight     []float64 // self weight, N/m; optional
	Strength   []float64 // characteristic breaking force, N; optional, 0 = not given
	Group      []int32   // index into Groups; optional
	MemberName Names     // may be empty
	CableOf    []int32   // index into Cables or −1; optional
	Groups     []string
	Cables     []Cable

	// Triangles.
	Corners  [][3]int32   // counter-clockwise seen from the positive side
	FabricOf []int32      // index into Fabrics
	Warp     []r3.Vec     // wanted warp direction, not zero; its projection into the triangle is the warp
	Stress   [][2]float64 // wanted stress in warp and weft, N/m of width
	Fabrics  []Fabric
	// Reference (optional) are node positions of the unstressed fabric, for
	// elastic fabrics. nil: Position.
	Reference []r3.Vec

	// Enclosures are volumes of air of which the volume is given and the
	// pressure found; a fabric bounds at most one. Optional.
	Enclosures []Enclosure

	Rings []Ring
	Lines []Line

	// SelfWeight asks for the weights of members, fabrics and rings to act
	// during form finding, downwards: half of Weight·Unstressed of a member
	// (Weight·current length where no unstressed length is given) on each of
	// its ends, a third of Weight·current area of a triangle on each of its
	// corners, the weight of a rigid ring on its centre and of a cable ring
	// in equal parts on its nodes.
	SelfWeight bool
}

// FixedAt returns the directions in which node i does not move by itself:
// supported or held.
func (s *Structure) FixedAt(i int) Freedom {
	f := s.Fixed[i]
	if s.Held != nil {
		f |= s.Held[i]
	}
	return f
}

// MasterOf returns the node that node i is tied to, or −1.
func (s *Structure) MasterOf(i int) int32 {
	if s.Master == nil {
		return -1
	}
	return s.Master[i]
}

// LoadAt returns the dead load on node i in N.
func (s *Structure) LoadAt(i int) r3.Vec {
	if s.Load == nil {
		return r3.Vec{}
	}
	return s.Load[i]
}

// Size returns the length of the diagonal of the box around all nodes, m.
func (s *Structure) Size() float64 {
	lo, hi := Bounds(s.Position)
	return r3.Norm(r3.Sub(hi, lo))
}

// Bounds returns the corners of the smallest box around the points; two zero
// vectors when there are none.
func Bounds(p []r3.Vec) (lo, hi r3.Vec) {
	if len(p) == 0 {
		return
	}
	lo, hi = p[0], p[0]
	for _, v := range p[1:] {
		lo = r3.Vec{X: min(lo.X, v.X), Y: min(lo.Y, v.Y), Z: min(lo.Z, v.Z)}
		hi = r3.Vec{X: max(hi.X, v.X), Y: max(hi.Y, v.Y), Z: max(hi.Z, v.Z)}
	}
	return lo, hi
}
