package fdm

import (
	"context"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/spatial/r3"
)

// J is the matrix of derivatives of the weighted differences by the logarithms
// of the force densities. It is never formed unless it has few rows or columns.

// forward does out = J·v.
func (f *fit) forward(out, v []float64) error {
	clear(f.force)
	clear(f.change)
	for k, i := range f.variable {
		if i < 0 || f.frozen[i] || v[i] == 0 {
			continue
		}
		dq := f.q[k] * v[i]
		f.change[k] = dq
		e := f.s.ends[k]
		d := r3.Scale(dq, r3.Sub(f.x[e[1]], f.x[e[0]]))
		f.force[e[0]] = r3.Add(f.force[e[0]], d)
		f.force[e[1]] = r3.Sub(f.force[e[1]], d)
	}
	if err := f.s.solve(f.move, f.force); err != nil {
		return err
	}
	g := f.goals
	for t := range out {
		sum := 0.0
		for j := g.nodeFirst[t]; j < g.nodeFirst[t+1]; j++ {
			sum += r3.Dot(g.byPosition[j], f.move[g.node[j]])
		}
		for j := g.memberFirst[t]; j < g.memberFirst[t+1]; j++ {
			sum += g.byDensity[j] * f.change[g.member[j]]
		}
		out[t] = sum
	}
	return nil
}

// backward does out = Jᵀ·w: the system is symmetric, so that one solve with the
// derivatives by position as forces serves all members.
func (f *fit) backward(out, w []float64) error {
	g := f.goals
	clear(f.force)
	for t, c := range w {
		if c == 0 {
			continue
		}
		for j := g.nodeFirst[t]; j < g.nodeFirst[t+1]; j++ {
			i := g.node[j]
			f.force[i] = r3.Add(f.force[i], r3.Scale(c, g.byPosition[j]))
		}
	}
	if err := f.s.solve(f.move, f.force); err != nil {
		return err
	}
	clear(out)
	for k, i := range f.variable {
		if i < 0 || f.frozen[i] {
			continue
		}
		e := f.s.ends[k]
		out[i] += f.q[k] * r3.Dot(r3.Sub(f.move[e[0]], f.move[e[1]]), r3.Sub(f.x[e[1]], f.x[e[0]]))
	}
	for t, c := range w {
		for j := g.memberFirst[t]; j < g.memberFirst[t+1]; j++ {
			k := g.member[j]
			if i := f.variable[k]; i >= 0 && !f.frozen[i] {
				out[i] += c * g.byDensity[j] * f.q[k]
			}
		}
	}
	return nil
}

// stepper finds the step p that makes ‖J·p + off‖² + mu·‖p‖² least.
type stepper interface {
	// linearise is called at every new shape, before step.
	linearise(ctx context.Context) error
	// step writes the step and returns ‖J·p‖, what it promises to remove.
	step(ctx context.Context, p []float64, mu float64) (float64, error)
}

// few is the number of rows or columns up to which J is formed: about where the
// sparse step becomes faster on nets. room is the largest number of its entries.
const (
	few  = 128
	room = 1 << 24
)

func (f *fit) newStepper() stepper {
	rows, columns := len(f.off), f.count
	if narrow := min(rows, columns); narrow > 0 && narrow <= few && rows*columns <= room {
		return &denseStep{f: f}
	}
	return &sparseStep{f: f}
}

// denseStep forms J, row by row or column by column, and solves the smaller of
// the two normal systems.
type denseStep struct {
	f *fit
	// j holds the rows of J, or its columns when there are fewer of them.
	j     [][]float64
	whole *mat.Dense // of which j are the rows
	// product holds all inner products of two entries of j.
	product *mat.SymDense
	scale   float64 // mean of its diagonal
}

func (d *denseStep) byRows() bool { return len(d.f.off) <= d.f.count }

func (d *denseStep) linearise(ctx context.Context) error {
	f := d.f
	n, long := len(f.off), f.count
	if !d.byRows() {
		n, long = long, n
	}
	if d.j == nil {
		d.j = make([][]float64, n)
		d.whole = mat.NewDense(n, long, nil)
		for i := range d.j {
			d.j[i] = d.whole.RawRowView(i)
		}
	}
	unit := make([]float64, n)
	for i := range d.j {
		if err := ctx.Err(); err != nil {
			return err
		}
		unit[i] = 1
		var err error
		if d.byRows() {
			err = f.backward(d.j[i], unit)
		} else {
			err = f.forward(d.j[i], unit)
		}
		if err != nil {
			return err
		}
		unit[i] = 0
	}
	d.product = mat.NewSymDense(n, nil)
	d.product.SymOuterK(1, d.whole)
	d.scale = mat.Trace(d.product) / float64(n)
	return nil
}

func (d *denseStep) step(_ context.Context, p []float64, mu float64) (float64, error) {
	f := d.f
	n := len(d.j)
	clear(p)
	if d.scale == 0 || !finite(d.scale) {
		return 0, nil
	}
	rhs := mat.NewVecDense(n, nil)
	for i := range n {
		if d.byRows() {
			rhs.SetVec(i, -f.off[i])
		} else {
			rhs.SetVec(i, -dotFlat(d.j[i], f.off))
		}
	}
	var y mat.VecDense
	var chol mat.Cholesky
	solved := false
	floor := 1e-15 * d.scale
	for tries := 0; !solved; tries++ {
		if tries == 8 {
			return 0, nil // beyond numbers
		}
		damped := mat.NewSymDense(n, nil)
		damped.CopySym(d.product)
		for i := range n {
			damped.SetSym(i, i, damped.At(i, i)+mu+floor)
		}
		if solved = chol.Factorize(damped); solved {
			// A bad condition is what the damping is for.
			_ = chol.SolveVecTo(&y, rhs)
		}
		floor *= 100
	}
	out := make([]float64, len(f.off))
	if d.byRows() {
		for i := range n {
			addFlat(p, y.AtVec(i), d.j[i])
		}
		for i := range n {
			out[i] = dotFlat(d.j[i], p)
		}
	} else {
		for i := range n {
			p[i] = y.AtVec(i)
			addFlat(out, p[i], d.j[i])
		}
	}
	return norm2(out), nil
}

func dotFlat(a, b []float64) (sum float64) {
	for i, v := range a {
		sum += v * b[i]
	}
	return sum
}

func addFlat(y []float64, c float64, x []float64) {
	for i := range y {
		y[i] += c * x[i]
	}
}
