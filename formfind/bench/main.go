// Command bench measures how fast shapes are found:
//
//	go run ./formfind/bench
//	go run ./formfind/bench -triangles 15000,60000,250000 -methods newton,solve,relax,warm,lbfgs
//
// It prints one JSON object a line: case, method, triangles, seconds of
// processor time (of all processors together), wall (seconds by the clock),
// iterations, residual along the normals, relative error of the area where the exact
// one is known. At the end of a case its growth exponent (processor time ∝
// triangles^exponent) and ratios against other methods, by processor time and by
// the clock. The latter mean something on an idle machine only.
//
//   - newton: the front door from the coarsest mesh to a surface in balance along
//     its normals, residual 1e-9;
//   - solve: the whole front door: the same, the pass that balances all
//     directions, audit;
//   - one-level: natural force densities and Newton on the finest mesh alone;
//   - relax: dynamic relaxation in the shape-changing directions to the same
//     residual, from linear force densities (also on an even mesh) and from natural
//     ones, at one size (-relax);
//   - lbfgs: SciPy's L-BFGS-B on the area functional from the same start, at one
//     size (-relax), stopped after -limit seconds;
//   - warm: a canopy of 2,500 nodes found again after a mast head has moved,
//     everything cached.
package main

import (
	"bytes"
	"cmp"
	"context"
	_ "embed"
	"encoding/json"
	"errors"
	"flag"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"slices"
	"strconv"
	"strings"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm"
	"anticlast/formfind"
	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/internal/cases"
	"anticlast/formfind/newton"
	"anticlast/formfind/relax"
)

//go:embed lbfgs.py
var lbfgs []byte

type row struct {
	Case       string   `json:"case"`
	Method     string   `json:"method"`
	Triangles  int      `json:"triangles,omitempty"`
	Seconds    float64  `json:"seconds,omitempty"`
	Wall       float64  `json:"wall,omitempty"`
	Iterations int      `json:"iterations,omitempty"`
	Residual   float64  `json:"residual,omitempty"`
	Error      *float64 `json:"error,omitempty"`
	Ratio      float64  `json:"ratio,omitempty"`
	WallRatio  float64  `json:"wall_ratio,omitempty"`
	Exponent   float64  `json:"exponent,omitempty"`
	Note       string   `json:"note,omitempty"`
}

func (r row) print() {
	b, err := json.Marshal(r)
	if err != nil {
		panic(err) // numbers and strings only
	}
	fmt.Println(string(b))
}

func main() {
	if err := run(); err != nil {
		fmt.Fprintln(os.Stderr, "bench:", err)
		os.Exit(1)
	}
}

func run() error {
	sizes := flag.String("triangles", "15000,60000", "numbers of triangles")
	only := flag.String("cases", "catenoid,scherk,schwarz-d,canopy", "cases")
	methods := flag.String("methods", "newton,solve,warm", "methods: newton, solve, one-level, relax, lbfgs, warm")
	slow := flag.Int("relax", 60000, "number of triangles for relax and lbfgs")
	python := flag.String("python", "python3", "interpreter with SciPy, for lbfgs")
	limit := flag.Float64("limit", 60, "seconds for lbfgs")
	flag.Parse()
	ctx := context.Background()
	use := func(m string) bool { return slices.Contains(strings.Split(*methods, ","), m) }
	for k := range surfaces {
		if !slices.Contains(strings.Split(*only, ","), surfaces[k].name) {
			continue
		}
		var size, seconds []float64
		for _, f := range strings.Split(*sizes, ",") {
			want, err := strconv.Atoi(f)
			if err != nil {
				return fmt.Errorf("triangles: %w", err)
			}
			p, err := newProblem(k, want)
			if err != nil {
				return err
			}
			if use("newton") {
				r, err := byNewton(ctx, p)
				if err != nil {
					return err
				}
				r.print()
				size, seconds = append(size, math.Log(float64(r.Triangles))), append(seconds, math.Log(r.Seconds))
			}
			if use("solve") {
				if err := bySolve(ctx, p); err != nil {
					return err
				}
			}
			if use("one-level") {
				r, err := byOneLevel(ctx, p)
				if err != nil {
					return err
				}
				r.print()
			}
		}
		if len(size) > 1 {
			row{Case: surfaces[k].name, Method: "newton", Exponent: slope(size, seconds), Note: "growth"}.print()
		}
		p, err := newProblem(k, *slow)
		if err != nil {
			return err
		}
		if use("relax") {
			if err := byRelax(ctx, p); err != nil {
				return err
			}
		}
		if use("lbfgs") {
			if err := byLBFGS(ctx, p, *python, *limit); err != nil {
				return err
			}
		}
	}
	if use("warm") {
		return warm(ctx)
	}
	return nil
}

func slope(x, y []float64) float64 {
	mx, my := 0.0, 0.0
	for i := range x {
		mx, my = mx+x[i]/float64(len(x)), my+y[i]/float64(len(x))
	}
	a, b := 0.0, 0.0
	for i := range x {
		a, b = a+(x[i]-mx)*(y[i]-my), b+(x[i]-mx)*(x[i]-mx)
	}
	return a / b
}

func (p *problem) areaError(s *canopy.Structure, f *canopy.Form) *float64 {
	if p.area == 0 {
		return nil
	}
	e := math.Abs(cases.Area(s, f.Position)/p.area - 1)
	return &e
}

// start is five updates of natural force densities from the rough shape, as
// the front door starts; without updates the linear force density step alone.
func start(ctx context.Context, s *canopy.Structure, updates int) (*canopy.Form, error) {
	n := fdm.Network{Position: s.Position, Fixed: make([]fdm.Directions, len(s.Position)), Ends: s.Ends, Master: s.Master}
	for i := range n.Fixed {
		n.Fixed[i] = fdm.Directions(s.FixedAt(i))
	}
	panels := make([]fdm.Panel, len(s.Corners))
	for t := range panels {
		panels[t] = fdm.Panel{Corners: s.Corners[t], Warp: s.Warp[t], WarpStress: s.Stress[t][0], WeftStress: s.Stress[t][1]}
	}
	v, err := fdm.New(ctx, n, panels)
	if err != nil {
		return nil, err
	}
	g := fdm.Given{Force: make([]float64, len(s.Ends)), Density: make([]float64, len(s.Ends))}
	copy(g.Force, s.Given)
	from := s.Position
	if updates == 0 || cases.MinAngle(s, from) < 10*math.Pi/180 { // a rough shape that is no start
		q := make([]float64, len(s.Ends))
		for k, e := range s.Ends {
			q[k] = s.Given[k] / r3.Norm(r3.Sub(from[e[1]], from[e[0]]))
		}
		from = slices.Clone(from)
		if err := v.Shape(ctx, from, q); err != nil {
			return nil, err
		}
	}
	f := canopy.NewForm(s)
	if updates == 0 {
		copy(f.Position, from)
		return f, nil
	}
	r, err := v.Natural(ctx, from, g, updates)
	if err != nil {
		return nil, err
	}
	copy(f.Position, r.Position)
	return f, nil
}

// times is how often a quick method is run; the median of either time counts. Memory that others
// have left behind is cleared away before.
const times = 3

// byNewton is the front door from the coarsest mesh to a surface in balance in
// the shape-changing directions: force densities on the coarsest mesh, Newton on
// every one.
func byNewton(ctx context.Context, p *problem) (row, error) {
	var rows []row
	for range times {
		runtime.GC()
		rec := &engine.Recorder{}
		t, seconds, wall := startClock(), 0.0, 0.0
		r, err := formfind.SolveLevels(ctx, p.coarse, p.steps, formfind.Options{Recorder: rec, Stage: func(name string) {
			if name == "balance" {
				seconds, wall = t.read()
			}
		}})
		if err != nil {
			return row{}, err
		}
		if !r.Audit.Trusted {
			return row{}, fmt.Errorf("%s: %v", p.name, r.Audit.Reasons)
		}
		last := rec.Rows[len(rec.Rows)-1]
		if !(last.Residual <= 1e-9) {
			return row{}, fmt.Errorf("%s: residual %g", p.name, last.Residual)
		}
		rows = append(rows, row{Case: p.name, Method: "newton", Triangles: len(p.fine.Corners), Seconds: seconds, Wall: wall,
			Iterations: last.Iteration, Residual: last.Residual, Error: p.areaError(p.fine, r.Form)})
	}
	slices.SortFunc(rows, func(a, b row) int { return cmp.Compare(a.Wall, b.Wall) })
	wall := rows[times/2].Wall
	slices.SortFunc(rows, func(a, b row) int { return cmp.Compare(a.Seconds, b.Seconds) })
	rows[times/2].Wall = wall
	return rows[times/2], nil
}

// byOneLevel starts on the finest mesh: five updates of natural force densities
// and Newton, every step by a factorisation.
func byOneLevel(ctx context.Context, p *problem) (row, error) {
	runtime.GC()
	t := startClock()
	at, err := start(ctx, p.fine, 5)
	if err != nil {
		return row{}, err
	}
	f, out, err := newton.Engine{}.Find(ctx, p.fine, at, engine.Settings{})
	if err != nil {
		return row{}, err
	}
	if out.Status != engine.Converged {
		return row{}, fmt.Errorf("%s: %s", p.name, out.Why)
	}
	seconds, wall := t.read()
	return row{Case: p.name, Method: "one-level", Triangles: len(p.fine.Corners), Seconds: seconds, Wall: wall, Iterations: out.Iterations, Residual: out.Residual, Error: p.areaError(p.fine, f)}, nil
}

func bySolve(ctx context.Context, p *problem) error {
	runtime.GC()
	t := startClock()
	r, err := formfind.SolveLevels(ctx, p.coarse, p.steps, formfind.Options{})
	if err != nil {
		return err
	}
	if !r.Audit.Trusted {
		return fmt.Errorf("%s: %v", p.name, r.Audit.Reasons)
	}
	seconds, wall := t.read()
	row{Case: p.name, Method: "solve", Triangles: len(p.fine.Corners), Seconds: seconds, Wall: wall, Residual: r.Audit.ResidualRMS, Error: p.areaError(p.fine, r.Form)}.print()
	return nil
}

// byRelax relaxes from the linear force density step, on the refined mesh and on an
// even one, which suits that start better, and from the natural force densities that
// the front door starts relaxation with.
func byRelax(ctx context.Context, p *problem) error {
	own, err := byNewton(ctx, p)
	if err != nil {
		return err
	}
	for _, k := range []struct {
		method  string
		s       *canopy.Structure
		updates int
	}{{"relax", p.fine, 0}, {"relax on an even mesh", p.even(), 0}, {"relax from natural", p.fine, 5}} {
		runtime.GC()
		t := startClock()
		at, err := start(ctx, k.s, k.updates)
		if err != nil {
			return err
		}
		f, out, err := (&relax.Engine{}).Find(ctx, k.s, at, engine.Settings{})
		if err != nil {
			return err
		}
		seconds, wall := t.read()
		r := row{Case: p.name, Method: k.method, Triangles: len(k.s.Corners), Seconds: seconds, Wall: wall, Iterations: out.Iterations, Residual: out.Residual}
		if out.Status == engine.Converged {
			r.Error, r.Ratio = p.areaError(k.s, f), r.Seconds/own.Seconds
			r.WallRatio = r.Wall / own.Wall
			r.Note = fmt.Sprintf("ratios to newton in the same run (%.3g s, by the clock %.3g s)", own.Seconds, own.Wall)
		} else {
			r.Note = "no result: " + out.Why
		}
		r.print()
	}
	return nil
}

// handOver is what lbfgs.py reads.
type handOver struct {
	Position  [][3]float64 `json:"position"`
	Free      []bool       `json:"free"`
	Triangles [][3]int32   `json:"triangles"`
	Stress    float64      `json:"stress"`
	Members   [][2]int32   `json:"members"`
	Force     []float64    `json:"force"`
	Limit     float64      `json:"limit"`
}

func byLBFGS(ctx context.Context, p *problem, python string, limit float64) error {
	at, err := start(ctx, p.fine, 5)
	if err != nil {
		return err
	}
	h := handOver{Triangles: p.fine.Corners, Stress: p.fine.Stress[0][0], Members: p.fine.Ends, Force: p.fine.Given, Limit: limit}
	for i, x := range at.Position {
		h.Position = append(h.Position, [3]float64{x.X, x.Y, x.Z})
		h.Free = append(h.Free, p.fine.FixedAt(i) == 0)
	}
	dir, err := os.MkdirTemp("", "bench")
	if err != nil {
		return err
	}
	defer os.RemoveAll(dir)
	data, err := json.Marshal(h)
	if err != nil {
		return err
	}
	model, script := filepath.Join(dir, "model.json"), filepath.Join(dir, "lbfgs.py")
	if err := errors.Join(os.WriteFile(model, data, 0o600), os.WriteFile(script, lbfgs, 0o600)); err != nil {
		return err
	}
	cmd := exec.CommandContext(ctx, python, script, model)
	cmd.Stderr = os.Stderr
	text, err := cmd.Output()
	if err != nil {
		return fmt.Errorf("lbfgs: %w", err)
	}
	var got struct {
		Seconds    float64
		Iterations int
		Residual   float64 // along the normals
		MinAngle   float64 // rad
		Position   [][3]float64
	}
	if err := json.NewDecoder(bytes.NewReader(text)).Decode(&got); err != nil {
		return fmt.Errorf("lbfgs: %w", err)
	}
	f := canopy.NewForm(p.fine)
	for i, x := range got.Position {
		f.Position[i] = r3.Vec{X: x[0], Y: x[1], Z: x[2]}
	}
	r := row{Case: p.name, Method: "lbfgs", Triangles: len(p.fine.Corners), Seconds: got.Seconds, Iterations: got.Iterations, Residual: got.Residual, Error: p.areaError(p.fine, f)}
	if got.MinAngle < math.Pi/180 {
		r.Note = fmt.Sprintf("no result: its mesh collapsed (smallest angle %.2g°)", got.MinAngle*180/math.Pi)
		r.print()
		return nil
	}
	own, err := byNewton(ctx, p)
	if err != nil {
		return err
	}
	r.Ratio, r.Note = got.Seconds/own.Seconds, fmt.Sprintf("ratio to newton, to a residual of 1e-9 already, in the same run (%.3g s)", own.Seconds)
	r.print()
	return nil
}

// warm moves a mast head of a canopy of 2,500 nodes by a hundredth of its span
// to and fro and finds the form anew from the last one.
func warm(ctx context.Context) error {
	c := cases.FourPoint(10, 3, 2500, 30e3, 0.1, 49)
	cold, again, steps := math.Inf(1), math.Inf(1), 0
	var v *newton.Solver
	var f *canopy.Form
	for range 5 {
		t := processorSeconds()
		at, err := start(ctx, c.S, 5)
		if err != nil {
			return err
		}
		if v, err = newton.New(ctx, c.S); err != nil {
			return err
		}
		if f, _, err = v.Find(ctx, at, engine.Settings{}); err != nil {
			return err
		}
		cold = math.Min(cold, processorSeconds()-t)
	}
	head, up := len(c.S.Position)-1, 0.1
	const times = 40
	t := processorSeconds()
	for i := range times {
		c.S.Position[head].Z += up
		up = -up
		g, out, err := v.Find(ctx, f, engine.Settings{})
		if err != nil || out.Status != engine.Converged {
			return fmt.Errorf("warm: %w %s", err, out.Why)
		}
		f, steps = g, steps+out.Iterations
		if i%4 == 3 {
			again, t = math.Min(again, (processorSeconds()-t)/4), processorSeconds()
		}
	}
	row{Case: "canopy of 2,500 nodes", Method: "cold", Triangles: len(c.S.Corners), Seconds: cold}.print()
	row{Case: "canopy of 2,500 nodes", Method: "warm", Triangles: len(c.S.Corners), Seconds: again, Iterations: steps / times, Ratio: cold / again,
		Note: fmt.Sprintf("%.2f frames of 1/60 s; ratio cold to warm", again*60)}.print()
	return nil
}
