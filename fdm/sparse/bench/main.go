// Command bench times fdm/sparse on the matrices of cable nets and prints one
// line of JSON.
//
//	go run ./fdm/sparse/bench [flags] n net reps
//
// The nets quad and tri are n×n nodes with the boundary fixed, so that
// (n−2)² are free; the others have about as many unknowns (three times as many
// for blocks): delaunay, a triangulation of random points; radial, rings and
// spokes with all spokes tied at the centre; polar, a polar map whose rings are
// refined outwards; blocks, a triangulated net with three coupled unknowns per
// node.
//
// Times are in seconds, medians over reps: analyze and factor of a new system,
// refactor with other values, solve3 for three right-hand sides; cpu_ is the
// processor time of the process. With -dump FILE the matrix is written in
// Matrix Market form instead, for testdata/reference.cpp to read.
package main

import (
	"context"
	"encoding/json"
	"errors"
	"flag"
	"fmt"
	"io"
	"math"
	"os"
	"runtime"
	"runtime/debug"
	"slices"
	"strconv"
	"time"

	"anticlast/fdm/sparse"
)

func main() {
	if err := run(os.Args[1:], os.Stdout); err != nil {
		fmt.Fprintln(os.Stderr, "bench:", err)
		os.Exit(1)
	}
}

// report is the line printed.
type report struct {
	Tool        string  `json:"tool"`
	Net         string  `json:"net"`
	N           int     `json:"n"`
	Unknowns    int     `json:"N"`
	Ordering    string  `json:"ordering"`
	Mode        string  `json:"mode"`
	NonzerosA   int     `json:"nnzA"`
	NonzerosL   int64   `json:"nnzL"`
	Flops       float64 `json:"flops"`
	Analyze     float64 `json:"analyze"`
	Factor      float64 `json:"factor"`
	Refactor    float64 `json:"refactor"`
	Solve3      float64 `json:"solve3"`
	CPUAnalyze  float64 `json:"cpu_analyze"`
	CPUFactor   float64 `json:"cpu_factor"`
	CPURefactor float64 `json:"cpu_refactor"`
	CPUSolve3   float64 `json:"cpu_solve3"`
	BaseMB      float64 `json:"base_mb"`
	PeakMB      float64 `json:"peak_mb"`
	Resid       float64 `json:"resid"`
	Backward    float64 `json:"backward"`
	Checksum    float64 `json:"checksum"`
	Workers     int     `json:"workers"`
}

func run(args []string, out io.Writer) error {
	flags := flag.NewFlagSet("bench", flag.ContinueOnError)
	dump := flags.String("dump", "", "write the matrix to this file in Matrix Market form and stop")
	ldl := flags.Bool("ldl", false, "factor L·D·Lᵀ instead of L·Lᵀ")
	order := flags.String("order", "auto", "ordering: auto, dissection, degree")
	if err := flags.Parse(args); err != nil {
		return err
	}
	args = flags.Args()
	if len(args) != 3 {
		return errors.New("usage: bench [-dump FILE] [-ldl] [-order ORDER] n quad|tri|delaunay|radial|polar|blocks reps")
	}
	n, err := strconv.Atoi(args[0])
	if err != nil || n < 3 || n > 20000 {
		return fmt.Errorf("n is %q, want a whole number from 3 to 20000", args[0])
	}
	reps, err := strconv.Atoi(args[2])
	if err != nil || reps < 1 {
		return fmt.Errorf("reps is %q, want a positive whole number", args[2])
	}
	net, err := newNet(args[1], n)
	if err != nil {
		return err
	}
	if *dump != "" {
		return dumpMatrix(*dump, net)
	}
	o := sparse.Options{}
	switch *order {
	case "auto":
	case "dissection":
		o.Ordering = sparse.OrderDissection
	case "degree":
		o.Ordering = sparse.OrderMinimumDegree
	default:
		return fmt.Errorf("unknown ordering %q", *order)
	}
	kind := sparse.Cholesky
	if *ldl {
		kind = sparse.LDL
	}
	r, err := measure(net, n, args[1], reps, o, kind)
	if err != nil {
		return err
	}
	line, err := json.Marshal(r)
	if err != nil {
		return err
	}
	_, err = fmt.Fprintf(out, "%s\n", line)
	return err
}

// stopwatch collects wall and processor times.
type stopwatch struct{ wall, cpu []float64 }

func (s *stopwatch) time(f func() error) error {
	t, c := time.Now(), cpuSeconds()
	err := f()
	s.cpu = append(s.cpu, cpuSeconds()-c)
	s.wall = append(s.wall, time.Since(t).Seconds())
	return err
}

func median(v []float64) float64 {
	v = slices.Clone(v)
	slices.Sort(v)
	if n := len(v); n%2 == 0 {
		return (v[n/2-1] + v[n/2]) / 2
	}
	return v[len(v)/2]
}

func measure(net *net, n int, name string, reps int, o sparse.Options, kind sparse.Kind) (*report, error) {
	ctx := context.Background()
	values, b := net.fill(1)
	x := make([]float64, len(b))
	debug.FreeOSMemory()
	r := &report{Tool: "anticlast", Net: name, N: n, Unknowns: net.n, NonzerosA: net.n + len(net.pairs), BaseMB: peakMB(), Workers: runtime.GOMAXPROCS(0)}
	r.Mode = kind.String()
	var ta, tf, tr, ts stopwatch
	for rep := range reps {
		var a *sparse.Analysis
		var f *sparse.Factor
		err := ta.time(func() (err error) {
			a, err = sparse.Analyze(ctx, net.n, net.pairs, o)
			return err
		})
		if err != nil {
			return nil, err
		}
		err = tf.time(func() (err error) {
			if f, err = a.NewFactor(kind); err != nil {
				return err
			}
			return f.Refactor(ctx, values)
		})
		if err != nil {
			return nil, err
		}
		net.refill(values, b, 2+rep)
		if err := tr.time(func() error { return f.Refactor(ctx, values) }); err != nil {
			return nil, err
		}
		copy(x, b)
		if err := f.Solve(x, 3); err != nil {
			return nil, err
		}
		copy(x, b)
		if err := ts.time(func() error { return f.Solve(x, 3) }); err != nil {
			return nil, err
		}
		r.Resid, r.Backward = net.residual(values, x, b)
		if rep == 0 {
			for _, v := range x {
				r.Checksum += v
			}
			r.Checksum, _ = strconv.ParseFloat(strconv.FormatFloat(r.Checksum, 'g', 12, 64), 64)
			c := a.Cost()
			r.Ordering, r.NonzerosL, r.Flops = c.Ordering.String(), c.Nonzeros, c.Flops
		}
		if rep+1 < reps {
			net.refill(values, b, 1)
			// As free() does in the reference programs: memory may be used again.
			a, f = nil, nil
			runtime.GC()
		}
	}
	r.PeakMB = peakMB()
	r.Analyze, r.Factor, r.Refactor, r.Solve3 = median(ta.wall), median(tf.wall), median(tr.wall), median(ts.wall)
	r.CPUAnalyze, r.CPUFactor, r.CPURefactor, r.CPUSolve3 = median(ta.cpu), median(tf.cpu), median(tr.cpu), median(ts.cpu)
	return r, nil
}

// residual is ‖b−Ax‖∞/‖b‖∞ and ‖b−Ax‖∞/(‖A‖∞‖x‖∞+‖b‖∞). It overwrites b.
func (t *net) residual(values, x, b []float64) (resid, backward float64) {
	top := func(v []float64) (m float64) {
		for _, a := range v {
			m = max(m, math.Abs(a))
		}
		return m
	}
	nb := top(b)
	res := b
	norm := make([]float64, t.n)
	for i := range t.n {
		norm[i] = math.Abs(values[i])
		for r := range 3 {
			res[3*i+r] -= values[i] * x[3*i+r]
		}
	}
	for k, p := range t.pairs {
		v := values[t.n+k]
		i, j := int(p[0]), int(p[1])
		norm[i] += math.Abs(v)
		norm[j] += math.Abs(v)
		for r := range 3 {
			res[3*i+r] -= v * x[3*j+r]
			res[3*j+r] -= v * x[3*i+r]
		}
	}
	nr := top(res)
	return nr / nb, nr / (top(norm)*top(x) + nb)
}
