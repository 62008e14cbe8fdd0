package canopy

import "gonum.org/v1/gonum/spatial/r3"

// Caution is the sentence every output carries.
const Caution = "For preliminary design only. Not a structural verification: local codes and a licensed structural engineer decide. See SAFETY.md."

// Program names what made a result.
type Program struct {
	Name    string
	Version string
	Engines []string
}

// Result is everything that is known at the end: what was asked, what was
// found, how far it can be believed.
type Result struct {
	Program   Program
	Title     string
	File      string // base name of the model file, "-" for standard input
	Digest    string // "sha256:" + hex of the model's bytes (all of its files)
	Limits    Limits
	Factors   Factors
	North     *float64 // rad clockwise from the y axis seen from above; nil = not given
	Structure *Structure
	Form      *Form
	Audit     Audit
	Findings  []Finding
	Summary   Quantities
}

// Severity orders findings.
type Severity uint8

// Severities of a finding.
const (
	Note    Severity = iota // worth knowing
	Warning                 // outside common practice or close to a limit
	Broken                  // a limit the model sets is not met
)

var severityNames = [...]string{"note", "warning", "broken"}

func (s Severity) String() string { return severityNames[s] }

// Finding is one remark on a result with the places it is about.
type Finding struct {
	ID       string // stable identifier, e.g. "slope-low"
	Severity Severity
	Text     string  // one plain sentence with numbers in kN, kN/m, m, mm, °
	Value    float64 // worst value found, SI
	Limit    float64 // the limit it was held against, SI
	Source   string  // "model", "common practice" or a published source
	Places   []Place // worst first, at most a handful
	Count    int     // how many places in all
}

// Place names where something is, in words a person can find in the tables.
type Place struct {
	Kind  string // "node", "member", "triangle", "cable", "line", "ring", "fabric"
	Index int32
	Name  string
	At    r3.Vec // m
}

// Spread describes how a value is distributed, weighted by area.
type Spread struct {
	Min, P5, Mean, P95, Max float64
}

// Audit is the independent proof of a Form: numbers computed from what is
// reported, by code that did not produce it. Ratios are dimensionless.
type Audit struct {
	Trusted bool
	Reasons []string // why it is not trusted, in plain words; empty when it is

	// Nodal residual over the forces that meet at the node (loads included),
	// over all directions in which a node is free.
	ResidualRMS   float64 // ‖r‖₂/‖s‖₂
	ResidualWorst float64 // maxᵢ|rᵢ|/max sᵢ
	ResidualNode  int32   // node of the largest residual
	// Largest |rᵢ|/sᵢ over single nodes.
	ResidualLargest float64

	// Global balance of reported reactions with loads, relative to Σ|R|.
	ForceBalance, MomentBalance float64
	// Virial identity ΣA·tr σ + ΣT·L = ΣR·x + ΣF·x from reported stresses, relative.
	Virial float64
	// Largest difference between reported and recomputed reactions, member
	// forces against their laws, and stresses against theirs, relative.
	ReactionMismatch, ForceMismatch float64
	// Largest difference of an enclosed volume from the one asked for, relative;
	// 0 without air of given volume.
	VolumeMismatch float64

	// Stability of the prescribed-stress problem in the shape-changing directions.
	StabilityKnown bool
	Unstable       int     // number of unstable directions
	Softest        float64 // how firmly the shape sits: smallest eigenvalue of the tangent, tension tributary to the nodes as mass, times the square of the diameter about the centroid, –; does not depend on mesh, scale or level of prestress; NaN when not computed
	SoftestNode    int32   // where its mode moves most, −1 when not computed
	StabilityNote  string  // why it is not known or not computed

	// Tension where it is claimed.
	SlackCables, PushedCables int
	CompressedTriangles       int

	// Mesh quality.
	MinAngle     float64 // smallest triangle angle, rad; 0 when there are no triangles
	MinAngleTri  int32
	MeanAngleMin float64 // mean over triangles of their smallest angle, rad
	ShortestOver float64 // shortest member over the mean member length

	// Discretisation estimates how far the surface is from the smooth one over the
	// model's size, from how far one refinement of the mesh moves it; NaN when not judged.
	Discretisation float64
}

// Quantities are the sums and spreads a person asks for first.
type Quantities struct {
	FabricArea                   []float64 // m², per fabric
	WarpAchieved                 []Spread  // per fabric: stress in warp over specified
	WeftAchieved                 []Spread  // per fabric: stress in weft over specified
	MajorAchieved, MinorAchieved []Spread  // per fabric: principal stresses over the specified larger and smaller
	Ratio                        []Spread  // per fabric: (warp/weft) over its nominal
	Shear                        []Spread  // per fabric: |shear| over the mean specified stress
	Cables                       []CableReport
	Lines                        []LineReport
	KindLength                   [KindStrut + 1]float64 // total length by Kind, m
	FabricUtilisation            []float64              // per fabric, 0 = not computed
	Enclosed                     []float64              // per enclosure: the volume it encloses, m³
}

// CableReport is what a cable carries.
type CableReport struct {
	Length                        float64 // m
	Chord, Sag                    float64 // m
	ForceMin, ForceMean, ForceMax float64 // N
	Evenness                      float64 // (max − min)/mean
	Utilisation                   float64 // demand over design resistance, 0 = not computed
}

// LineReport is the load along a fixed line, N/m, from the reactions of its
// nodes. The two ends of an open line belong to what else meets there and are
// left out.
type LineReport struct {
	Length         float64 // m
	Min, Mean, Max float64 // N/m along the line, size of the reaction
	Total          r3.Vec  // N, sum of reactions
}
