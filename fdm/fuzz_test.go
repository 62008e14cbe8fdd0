package fdm_test

import (
	"context"
	"encoding/binary"
	"math"
	"testing"

	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/fdm"
)

// FuzzSolver feeds arbitrary networks to New, Shape, Natural and Fit. Whatever
// comes in, an error or a finite shape in balance comes out.
func FuzzSolver(f *testing.F) {
	f.Add([]byte("3\x07\x00\x07"), []byte("ababab"), []byte("123456789012"))
	f.Add([]byte{5, 7, 0, 0, 0, 7}, []byte{0, 1, 1, 2, 2, 3, 3, 4, 1, 3}, []byte{9, 9, 200, 3, 77, 1, 0, 255})
	f.Add([]byte{9, 7, 7, 7, 0, 0, 0, 64, 64, 1}, []byte{0, 3, 1, 4, 2, 5, 3, 4, 4, 5, 5, 3}, []byte{})
	f.Fuzz(func(t *testing.T, nodes, links, numbers []byte) {
		if len(nodes) == 0 {
			return
		}
		at := 0
		number := func() float64 {
			if len(numbers) == 0 {
				return 1
			}
			var b [8]byte
			for i := range b {
				b[i] = numbers[(at+i)%len(numbers)]
			}
			at++
			switch b[0] % 8 {
			case 0: // any bits at all
				return math.Float64frombits(binary.LittleEndian.Uint64(b[:]))
			case 1:
				return -float64(b[1]) / 16
			case 2:
				return 0
			}
			return float64(b[1]) / 16
		}
		count := min(len(nodes)-1, 40)
		n := fdm.Network{Position: make([]r3.Vec, count), Fixed: make([]fdm.Directions, count), Load: make([]r3.Vec, count), Master: make([]int32, count)}
		tied := false
		for i := range count {
			n.Position[i] = vec(number(), number(), number())
			n.Fixed[i] = fdm.Directions(nodes[i+1])
			n.Load[i] = vec(0, 0, number())
			n.Master[i] = -1
			if nodes[i+1]&64 != 0 {
				n.Master[i] = int32(nodes[i+1]>>3) - 3
				tied = true
			}
		}
		var panels []fdm.Panel
		var q []float64
		for k := 0; k+2 < len(links) && k < 200; k += 2 {
			a, b, c := int32(links[k])%48, int32(links[k+1])%48, int32(links[k+2])%48
			if nodes[0]&1 != 0 && k%6 == 0 {
				panels = append(panels, fdm.Panel{Corners: [3]int32{a, b, c}, Warp: vec(number(), number(), number()), WarpStress: number(), WeftStress: number()})
				continue
			}
			n.Ends = append(n.Ends, [2]int32{a, b})
			q = append(q, number())
		}
		ctx := context.Background()
		s, err := fdm.New(ctx, n, panels)
		if err != nil {
			_ = err.Error()
			return
		}
		x := make([]r3.Vec, count)
		if err := s.Shape(ctx, x, q); err != nil {
			_ = err.Error()
			copy(x, n.Position)
		} else if len(panels) == 0 {
			for _, p := range x {
				if !(r3.Norm(p) < math.Inf(1)) {
					t.Fatalf("a shape with %v in it", p)
				}
			}
			if !tied {
				// What coordinates of this size cannot express does not count.
				far, stiff := 0.0, 0.0
				for _, p := range x {
					far = max(far, r3.Norm(p))
				}
				for _, v := range q {
					stiff = max(stiff, math.Abs(v))
				}
				if worst, most := outOfBalance(n, x, q); worst > 1e-6*most+1e-12*far*stiff {
					t.Fatalf("out of balance by %g of %g", worst, most)
				}
			}
		}
		r, err := s.Natural(ctx, x, fdm.Given{Force: q}, 2)
		if err != nil {
			_ = err.Error()
		} else {
			for _, p := range r.Position {
				if !(r3.Norm(p) < math.Inf(1)) {
					t.Fatalf("a natural shape with %v in it", p)
				}
			}
			if !(r.Residual < math.Inf(1)) {
				t.Fatalf("natural residual %g", r.Residual)
			}
		}
		var targets []fdm.Target
		for k := range n.Ends {
			targets = append(targets, fdm.Target{Quantity: fdm.Quantity(k % 4), Members: []int32{int32(k), int32((k + 1) % len(n.Ends))}, Value: number()})
		}
		if _, err := s.Fit(ctx, q, targets[:min(len(targets), 3)], fdm.FitSettings{MaxIterations: 5}); err != nil {
			_ = err.Error()
		}
	})
}
