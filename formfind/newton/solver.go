package newton

import (
	"context"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm/sparse"
	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/internal/crew"
)

// Solver finds shapes of one structure again and again. What depends on the
// topology only (directions, pattern, ordering, symbolic factorisation) is kept
// from call to call.
//
// Between calls the numbers of the structure may be changed in place:
// positions, loads, given forces and force densities, stiffnesses, unstressed
// lengths, stresses, weights, pressures, values of cables, volumes of
// enclosures. Nodes, members, triangles, supports, laws, ties and the members of
// cables may not. A Solver is not safe for concurrent use.
type Solver struct {
	s *canopy.Structure

	// Topology.
	memberPtr []int32 // members at node i: memberList[memberPtr[i]:memberPtr[i+1]]
	member    []int32
	filmAt    []bool // node has triangles
	hasTied   []bool // node is the centre of a rigid ring
	seamAt    map[int32][]int32
	openEdges [][2]int32
	active    []bool // member takes part (not of a CableBalance cable)

	commons    []common  // cables of common force, then air of given volume
	firstForce []float64 // the forces they start from
	comOf      []int32   // member → commons or −1
	pocketOn   []int32   // fabric → commons or −1
	sideOn     []float64 // fabric → +1 where its positive side looks out of the air

	// Unknowns, for the classes at the last start.
	cls     []class
	lines   map[int32]line
	start   []int32 // unknown directions of node i: basis[start[i]:start[i+1]]
	first   []int32 // first unknown of node i (of its centre when tied), −1 none
	unknown int
	pattern *pattern

	analysis  *sparse.Analysis // made when first needed
	chol      *sparse.Factor
	ldl       *sparse.Factor
	gridOrder []int32    // unknowns in the order in which triangles meet them
	gridPlace []int32    // of each unknown in order
	expected  *grids     // that Above may be asked for
	grids     *grids     // nil: every step by a factor
	crew      *crew.Crew // during a call; nil works alone
	byGrids   bool       // the last step was solved by grids
	reuse     bool       // keep the tangent of the step before
	target    float64    // wanted residual

	// Pieces of large meshes for several processors.
	patches       *patches // nil: everyTriangle is one piece
	everyTriangle []corners
	pieces        []partial

	// Work.
	values       []float64
	shifted      []float64
	now, trial   state
	normalSum    []r3.Vec
	resumed      bool // magnitudes are those of the start
	uneven       bool // some warp and weft stresses differ
	unevenFabric []bool
	magnitude    *magnitudes // nil unless uneven
	mixing       anderson
	approaching  bool
	rhs          []float64
	columns      []float64
	areaStart    []float64
	lengthStart  []float64
	lastShift    float64
	positive     bool    // v.values were factorised and are positive definite
	meshSize     float64 // side of a typical triangle, m
	inside       *spread // nodes inside the fabric follow its edges
	everywhere   *spread // all follow moved supports
	carryWeights []float64
	edgeOf       []int32
	slideWork    []r3.Vec
	along        []r3.Vec // how nodes slide in the step at hand, nil
}

// state is a shape with what follows from it.
type state struct {
	at                []r3.Vec
	basis             []r3.Vec
	force             []float64 // common forces
	pull              []r3.Vec  // resultant of pulls and loads at each node, tied nodes' forces left where they act
	size              []float64 // sum of the sizes of the forces that meet at each node
	reduced           []float64 // Bᵀ·pull by unknown
	cond              []condition
	own               []float64 // approach: forces of elastic members
	energy            float64
	eta               float64
	worst             float64
	worstAt           int32
	noise, noiseWorst float64 // what rounding leaves of eta and worst in stiff members
	merit             float64
	collapse          int32 // a triangle without area or, negative, −1−member without length; else none
}

const none = math.MinInt32

// nodesAHand is the number of nodes for which another processor pays.
const nodesAHand = 5000

// New prepares a solver for s: checks what it can treat and builds the pattern
// from the positions of s.
func New(ctx context.Context, s *canopy.Structure) (*Solver, error) {
	if err := s.Validate(); err != nil {
		return nil, fmt.Errorf("newton: %w", err)
	}
	for t := range s.Corners {
		if s.Fabrics[s.FabricOf[t]].Elastic {
			return nil, fmt.Errorf("%w (fabric %s)", ErrElasticFabric, s.Fabrics[s.FabricOf[t]].Name)
		}
	}
	v := &Solver{s: s}
	if err := v.topology(); err != nil {
		return nil, err
	}
	if err := v.prepare(ctx, s.Position, false); err != nil {
		return nil, err
	}
	return v, nil
}

// checkStress refuses what a film cannot be, and prepares for unequal stress.
func (v *Solver) checkStress(ctx context.Context) error {
	s := v.s
	uneven := make([]bool, len(s.Fabrics))
	v.uneven = false
	for t, p := range s.Stress {
		if !(p[0] > 0) || !(p[1] > 0) {
			return fmt.Errorf("%w (fabric %s: warp %g, weft %g N/m)", ErrNotTension, s.Fabrics[s.FabricOf[t]].Name, p[0], p[1])
		}
		if isUneven(p) {
			uneven[s.FabricOf[t]], v.uneven = true, true
		}
	}
	if !slices.Equal(uneven, v.unevenFabric) {
		v.magnitude, v.unevenFabric = nil, uneven
	}
	if v.magnitude == nil && v.uneven {
		var err error
		if v.magnitude, err = v.newMagnitudes(ctx); err != nil {
			return err
		}
	}
	if v.magnitude != nil {
		v.magnitude.reset()
	}
	return nil
}

func (v *Solver) topology() error {
	s := v.s
	n := len(s.Position)
	v.filmAt = make([]bool, n)
	v.hasTied = make([]bool, n)
	v.active = make([]bool, len(s.Ends))
	v.comOf = make([]int32, len(s.Ends))
	for m := range s.Ends {
		v.active[m] = true
		v.comOf[m] = -1
	}
	for c := range s.Cables {
		cb := &s.Cables[c]
		switch cb.Law {
		case canopy.CableBalance:
			for _, m := range cb.Members {
				v.active[m] = false
			}
		case canopy.CableSag, canopy.CableLength, canopy.CableElastic:
			k := int32(len(v.commons))
			used := false
			for _, m := range cb.Members {
				if s.Law[m] == canopy.LawCable {
					v.comOf[m] = k
					used = true
				}
			}
			if used {
				v.commons = append(v.commons, common{cable: int32(c)})
			}
		}
	}
	v.addPockets()
	v.memberPtr = make([]int32, n+1)
	for m, e := range s.Ends {
		if !v.active[m] {
			continue
		}
		if s.Law[m] == canopy.LawCable && v.comOf[m] < 0 {
			return fmt.Errorf("newton: member %s takes its force from a cable without a law of its own", s.MemberName.At(m))
		}
		v.memberPtr[e[0]+1]++
		v.memberPtr[e[1]+1]++
	}
	for i := range n {
		v.memberPtr[i+1] += v.memberPtr[i]
	}
	v.member = make([]int32, v.memberPtr[n])
	fill := slices.Clone(v.memberPtr[:n])
	for m, e := range s.Ends {
		if !v.active[m] {
			continue
		}
		for _, i := range e {
			v.member[fill[i]] = int32(m)
			fill[i]++
		}
	}
	for i := range n {
		if m := s.MasterOf(i); m >= 0 {
			v.hasTied[m] = true
		}
	}
	for _, c := range s.Corners {
		v.filmAt[c[0]], v.filmAt[c[1]], v.filmAt[c[2]] = true, true, true
	}
	v.seamAt = map[int32][]int32{}
	sides(n, s.Corners, func(i, j int32, uses int) {
		switch {
		case uses == 1:
			v.openEdges = append(v.openEdges, [2]int32{i, j})
		case uses > 2:
			v.seamAt[i] = append(v.seamAt[i], j)
			v.seamAt[j] = append(v.seamAt[j], i)
		}
	})
	return nil
}

func (v *Solver) membersAt(i int32) []int32 { return v.member[v.memberPtr[i]:v.memberPtr[i+1]] }

// prepare numbers the unknowns and analyses the pattern, unless those of the
// last call still fit.
func (v *Solver) prepare(ctx context.Context, at []r3.Vec, all bool) error {
	cls, lines, err := v.classify(at, all)
	if err != nil {
		return err
	}
	s := v.s
	n := len(s.Position)
	old := v.start
	same := v.pattern != nil && slices.Equal(cls, v.cls)
	v.cls, v.lines = cls, lines
	start := make([]int32, n+1)
	first := make([]int32, n)
	unknown := int32(0)
	for i := range n {
		first[i] = -1
		k := 0
		if cls[i] == tied {
			k = len(free(s.FixedAt(int(s.MasterOf(i)))))
		} else {
			k = v.countDirections(int32(i), at)
			if k > 0 {
				first[i] = unknown
				unknown += int32(k)
			}
		}
		start[i+1] = start[i] + int32(k)
	}
	for i := range n {
		if cls[i] == tied {
			first[i] = first[s.MasterOf(i)]
		}
	}
	if same && slices.Equal(start, old) {
		return nil
	}
	v.start, v.first, v.unknown = start, first, int(unknown)
	v.pattern = v.newPattern()
	v.analysis, v.chol, v.ldl, v.inside = nil, nil, nil, nil
	v.slideWork = make([]r3.Vec, n)
	v.arrange()
	v.preparePieces()
	nv := v.unknown + len(v.pattern.pairs)
	v.values = make([]float64, nv)
	v.shifted = make([]float64, nv)
	v.normalSum = make([]r3.Vec, n)
	v.rhs = make([]float64, v.unknown*(1+len(v.commons)))
	v.columns = make([]float64, v.unknown*len(v.commons))
	v.areaStart = make([]float64, len(s.Corners))
	v.lengthStart = make([]float64, len(s.Ends))
	for _, st := range []*state{&v.now, &v.trial} {
		*st = state{
			at:      make([]r3.Vec, n),
			basis:   make([]r3.Vec, start[n]),
			force:   make([]float64, len(v.commons)),
			pull:    make([]r3.Vec, n),
			size:    make([]float64, n),
			reduced: make([]float64, v.unknown),
			cond:    make([]condition, len(v.commons)),
		}
	}
	return nil
}

// factorOf returns the factorisation in at, which is made, after the ordering,
// when it is first asked for.
func (v *Solver) factorOf(ctx context.Context, at **sparse.Factor, kind sparse.Kind) (*sparse.Factor, error) {
	var err error
	if v.analysis == nil {
		if v.analysis, err = sparse.Analyze(ctx, v.unknown, v.pattern.pairs, sparse.Options{}); err != nil {
			return nil, fmt.Errorf("newton: %w", err)
		}
	}
	if *at == nil {
		if *at, err = v.analysis.NewFactor(kind); err != nil {
			return nil, fmt.Errorf("newton: %w", err)
		}
	}
	return *at, nil
}

// place fills at with the starting positions: those of the form, with every
// node put where its supports, the designer or its ring want it.
func (v *Solver) place(start *canopy.Form, at []r3.Vec) error {
	s := v.s
	copy(at, s.Position)
	if start != nil {
		if len(start.Position) != len(at) {
			return fmt.Errorf("newton: the start has %d nodes, the structure %d", len(start.Position), len(at))
		}
		for i, p := range start.Position {
			f := s.FixedAt(i)
			q := s.Position[i]
			if !f.Has(0) {
				q.X = p.X
			}
			if !f.Has(1) {
				q.Y = p.Y
			}
			if !f.Has(2) {
				q.Z = p.Z
			}
			at[i] = q
		}
	}
	v.follow(at)
	return nil
}

// follow puts the nodes of rigid rings at their offset from the centre.
func (v *Solver) follow(at []r3.Vec) {
	s := v.s
	if s.Master == nil {
		return
	}
	for i, m := range s.Master {
		if m < 0 {
			continue
		}
		move := mask(s.FixedAt(i), r3.Sub(at[m], s.Position[m]))
		at[i] = r3.Add(s.Position[i], move)
	}
}

// Find starts at start, or at the positions of the structure when it is nil,
// and iterates to equilibrium in the shape-changing directions. Supported,
// held and tied directions take their place from the structure, so that a
// support may be moved between calls; the nodes of the start then follow it. Forces of a form with as many members
// start the unknown common forces.
//
// The form returned has the positions, the member forces by their laws, the
// nominal stresses of the fabric with the projected warp, and the reactions in
// supported directions.
func (v *Solver) Find(ctx context.Context, start *canopy.Form, set engine.Settings) (*canopy.Form, engine.Outcome, error) {
	set = set.WithDefaults(DefaultIterations)
	out := engine.Outcome{NegativePivots: -1}
	v.crew = crew.New(len(v.s.Position) / nodesAHand)
	defer func() {
		v.crew.Dismiss()
		v.crew = nil
	}()
	if err := ctx.Err(); err != nil {
		return nil, out, err
	}
	if err := v.checkStress(ctx); err != nil {
		return nil, out, err
	}
	at := make([]r3.Vec, len(v.s.Position))
	if err := v.place(start, at); err != nil {
		return nil, out, err
	}
	v.resume(start)
	if start != nil {
		if err := v.carry(ctx, start, at); err != nil {
			return nil, out, err
		}
	}
	if err := v.prepare(ctx, at, set.AllDirections); err != nil {
		return nil, out, err
	}
	v.wantVolumes()
	copy(v.now.at, at)
	if err := v.measure(at); err != nil {
		return nil, out, err
	}
	if why := v.impossible(at); why != "" {
		out.Status, out.Why = engine.Stalled, why
		v.evaluate(&v.now)
		v.startForces(start)
		f, err := v.form(&v.now)
		return f, out, err
	}
	v.startForces(start)
	out, err := v.rounds(ctx, set, start)
	if err != nil {
		return nil, out, err
	}
	f, err := v.form(&v.now)
	if err != nil {
		return nil, out, err
	}
	f.Converged = out.Status == engine.Converged
	f.Why = out.Why
	f.Engines = []string{Name}
	return f, out, nil
}
