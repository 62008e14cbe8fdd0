package canopy

import "gonum.org/v1/gonum/spatial/r3"

// Model is what the designer wants, as read from a model file. Either the
// drawn parts (points, edges, fabrics, …) are filled or Listed is. Parts refer
// to each other by name; the reader has checked that the names exist. Zero
// values mean "not given" where zero makes no sense.
type Model struct {
	Title       string
	Description string
	File        string // base name of the file it came from
	Digest      string // "sha256:…" of its bytes

	Points  []Point
	Edges   []Edge
	Cables  []ModelCable
	Fabrics []ModelFabric
	Nets    []Net
	Rings   []ModelRing
	Stays   []Stay // masts and guys

	Listed *Structure

	MeshSize float64 // wanted length of a mesh side, m; 0 = chosen from the size of the model
	// Coarser makes a mesh size that is chosen from the size of the model this
	// many times longer; 0 = as it is. The front door sets it for the first of
	// several levels.
	Coarser    float64
	SelfWeight bool // weights act during form finding
	Limits     Limits
	Factors    Factors
	North      *float64 // where north is, rad clockwise from the y axis seen from above; nil = not given
}

// Hold says what keeps a point where it is.
type Hold uint8

// Holds of a point.
const (
	// HoldAuto: held at the head of a mast or guy whose force is to be found;
	// free at a head where all of them have a force, length or stiffness;
	// supported in the other directions at the point of a rigid ring that may
	// move in some; else anchored.
	HoldAuto     Hold = iota
	HoldAnchored      // a support that reacts in the directions of Fixed
	HoldHeld          // position given; masts and guys balance it
	HoldFree          // position found
)

// Point is a named place.
type Point struct {
	Name  string
	At    r3.Vec // m
	Hold  Hold
	Fixed Freedom // directions of the support when anchored; 0 = all
	Load  r3.Vec  // N
	Line  int     // line in the model file, for messages
}

// EdgeKind says what an edge is made of.
type EdgeKind uint8

// Kinds of edge.
const (
	EdgeFixed EdgeKind = iota // held along its whole length
	EdgeCable                 // a cable
	EdgeSeam                  // nothing: two fabrics are joined along it
)

// Edge runs from one point to another and bounds any number of fabrics or nets,
// or none (a cable in space).
type Edge struct {
	Name     string
	From, To string
	Kind     EdgeKind
	Role     Kind   // KindEdgeCable, KindRidgeCable, KindValleyCable or KindCable
	Arch     bool   // a fixed line inside the canopy, reported as an arch
	Arc      bool   // fixed along the circular arc through Through
	Through  r3.Vec // m
	Cable    string // name of the ModelCable it belongs to
	Segments int    // number of mesh sides along it; 0 = from the mesh size
	Line     int
}

// ModelCable is a cable along one edge or several in a row.
type ModelCable struct {
	Name  string
	Edges []string
	// Clamped names the interior points at which the cable is clamped, so
	// that the forces on the two sides may differ; at all others it slides.
	Clamped []string
	// One of these decides its force.
	Force        float64 // N
	ForceDensity float64 // N/m
	MeanForce    float64 // N, turned into force densities that give it to each side where it starts
	Sag          float64 // sag/chord
	Unstressed   float64 // m, with Stiffness
	Stiffness    float64 // EA, N
	Length       float64 // m
	Weight       float64 // N/m
	Strength     float64 // N
	Line         int
}

// WarpRule says how the warp direction is laid on the surface.
type WarpRule uint8

// Rules for the warp direction.
const (
	WarpAlong  WarpRule = iota // a direction in space, projected into the surface
	WarpRadial                 // in the plane through the axis of the ring
	WarpAround                 // around the axis of the ring
)

// FabricPattern says how a fabric is meshed.
type FabricPattern uint8

// Patterns of fabric meshes.
const (
	FabricAuto  FabricPattern = iota // along the sides where that makes no thin triangles, else free
	FabricSides                      // lines along the sides of the boundary, or out from the ring
	FabricFree                       // triangles of even size in any outline
)

// ModelFabric is one piece of fabric.
type ModelFabric struct {
	Name     string
	Boundary []string // edges in order around it, in either direction each
	Ring     string   // the ring inside it, "" = none
	// Holes are openings inside it, each the edges in order around one, in
	// either direction each.
	Holes [][]string
	// Lines are edges inside it, other than those of its boundary and holes:
	// ridges, valleys, arches, seams. They end at points of the boundary, of
	// holes or of each other, or freely inside.
	Lines []string
	// Inside are points inside it at which a node of the mesh must lie.
	Inside  []string
	Pattern FabricPattern
	// Plane is the normal of the plane in which a free mesh is laid out; zero =
	// chosen.
	Plane      r3.Vec
	WarpRule   WarpRule
	WarpDir    r3.Vec  // for WarpAlong; zero = along the first edge
	Warp, Weft float64 // prestress, N/m
	// Volume is the volume of air that is shut in below the fabric, between it
	// and the plane of its boundary or the other fabrics named in VolumeWith,
	// in m³; its pressure is found. HasVolume says that it is given.
	Volume     float64
	HasVolume  bool
	VolumeWith []string
	MeshSize   float64 // m; 0 = the model's
	Properties Fabric  // stiffness, strength, weight, pressure; its Name is Name
	Line       int
}

// NetPattern says how the lines of a net are laid.
type NetPattern uint8

// Patterns of net lines.
const (
	// NetAuto: along the sides where the boundary is a fair patch of three or
	// four sides without holes, and no direction, angle, third family or equal
	// mesh asks for straight lines; else straight.
	NetAuto     NetPattern = iota
	NetSides               // two families along the sides of a patch of three or four
	NetStraight            // families of parallel lines in plan, clipped by any outline
	NetRadial              // lines from a hole to the boundary, and rings around it
)

// Net is a cable net inside a closed loop of edges.
type Net struct {
	Name     string
	Boundary []string
	// Holes are closed loops of edges inside the boundary, in which there is
	// no net.
	Holes     [][]string
	Pattern   NetPattern
	Direction r3.Vec // of straight lines, laid into the plan of the net; zero = along the first edge
	Families  []Family
	// MeshLength makes it an equal-mesh net: every link between two crossings
	// has this length in m, without stress, or at the tension MarkTension in
	// N where that is given. Links that end at the boundary are cut to fit and
	// carry the force of their family. Stiffness of the families is needed.
	MeshLength, MarkTension float64
	Line                    int
}

// Family is one family of net lines.
//
// Along the sides of a patch the first family runs along the first side and the
// second along the second. Straight lines of two families cross at right angles
// unless Angle says otherwise; a third family joins the crossings of the other
// two along the shorter diagonals. In a radial net the first family are the
// radial lines, the second the rings.
type Family struct {
	Name         string
	Spacing      float64 // m, between lines at right angles to them; of radial lines along the boundary
	Angle        float64 // rad, of straight lines from the net's direction, counter-clockwise
	HasAngle     bool
	Force        float64 // N, or
	ForceDensity float64 // N/m, or
	MeanForce    float64 // N, turned into force densities that give it to each link where it starts
	Stiffness    float64 // EA, N; with it the found force also fixes the unstressed length
	Weight       float64 // N/m
	Strength     float64 // N
}

// ModelRing is the ring of a high or low point.
type ModelRing struct {
	Name        string
	At          string // point at its centre
	Radius      float64
	Axis        r3.Vec // unit normal of its plane; default z
	Rigid       bool
	Free        Freedom // directions in which it may move
	Weight      float64 // N
	Force       float64 // of the cable, for a cable ring, N
	Hangers     int     // hangers from the ring to its point, cable ring only
	HangerForce float64 // N
	Strength    float64 // N, of the ring cable
	Line        int
}

// Stay is a mast or a guy: one straight member between two points.
type Stay struct {
	Name     string
	Mast     bool
	From, To string // foot and head of a mast; head and anchor of a guy
	// At most one of these; none: its force is found so that the held
	// points at its ends balance.
	Force      float64 // N, a guy's tension or a mast's thrust, both as positive numbers
	HasForce   bool
	Length     float64 // m
	Stiffness  float64 // EA, N, with Unstressed
	Unstressed float64 // m
	Weight     float64 // N/m
	Strength   float64 // N
	Line       int
}

// Limits are what the designer does not want exceeded. nil = not set.
type Limits struct {
	Achieved    *[2]float64 // bounds of stress achieved over specified, warp and weft
	Ratio       *[2]float64 // bounds of the warp:weft stress ratio
	StressMin   *float64    // least principal stress, N/m
	StressMax   *float64    // greatest principal stress, N/m
	CableMax    *float64    // greatest cable force, N
	SlopeMin    *float64    // least slope for drainage, rad
	ReactionMax *float64    // greatest reaction at one support, N
	Utilisation *float64    // greatest utilisation
	Headroom    []Headroom
}

// Headroom asks for free height over a region of the plan.
type Headroom struct {
	Name   string
	Height float64  // lowest permitted z of the canopy, m
	Region []r3.Vec // corners of the region in plan (z ignored); empty = everywhere
}

// Factors come from the user's own code of practice; zero = not given.
type Factors struct {
	Load   float64 // γ on the effects of prestress
	Fabric float64 // γ_M on the strength of fabric
	Cable  float64 // γ_M on the strength of cables
}
