package main

import (
	"bufio"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"strconv"
)

// net is a symmetric system with three right-hand sides whose values depend on
// a seed.
type net struct {
	n     int
	pairs [][2]int32
	// refill writes the diagonal, the entries of pairs, and b.
	refill func(values, b []float64, seed int)
}

func (t *net) fill(seed int) (values, b []float64) {
	values, b = make([]float64, t.n+len(t.pairs)), make([]float64, 3*t.n)
	t.refill(values, b, seed)
	return values, b
}

func newNet(name string, n int) (*net, error) {
	switch name {
	case "quad":
		return squareNet(n, false), nil
	case "tri":
		return squareNet(n, true), nil
	case "delaunay":
		return weighted((n-2)*(n-2), delaunayEdges(n-2), 1), nil
	case "radial":
		spokes := n - 2
		return weighted(1+spokes*spokes, radialEdges(spokes, spokes), 1), nil
	case "polar":
		return polarNet((n - 2) * (n - 2)), nil
	case "blocks":
		edges := squareNet(n, true).pairs
		return weighted((n-2)*(n-2), edges, 3), nil
	}
	return nil, fmt.Errorf("unknown net %q", name)
}

// forceDensity is the weight of edge e, uniform in [0.5, 2) by splitmix64
// (Steele, Lea & Flood 2014), so that every language gives the same.
func forceDensity(seed int, e uint64) float64 {
	z := (uint64(seed)*1000003+e)*0x9E3779B97F4A7C15 + 0x9E3779B97F4A7C15
	z = (z ^ z>>30) * 0xBF58476D1CE4E5B9
	z = (z ^ z>>27) * 0x94D049BB133111EB
	z ^= z >> 31
	return 0.5 + 1.5*float64(z>>11)*0x1p-53
}

// squareNet is the force-density system of n×n nodes with fixed boundary,
// nodes numbered row by row: node (i, j) has edges 3(in+j) to (i, j+1),
// 3(in+j)+1 to (i+1, j) and, in a triangulated net, 3(in+j)+2 to (i+1, j+1).
func squareNet(n int, tri bool) *net {
	m := n - 2
	free := func(i, j int) int {
		if i < 1 || j < 1 || i > m || j > m {
			return -1
		}
		return (i-1)*m + j - 1
	}
	type step struct{ i, j, node, kind int }
	steps := []step{{-1, 0, -n, 1}, {0, -1, -1, 0}, {0, 1, 0, 0}, {1, 0, 0, 1}}
	if tri {
		steps = append([]step{{-1, -1, -n - 1, 2}}, append(steps, step{1, 1, 0, 2})...)
	}
	count := 0
	each := func(do func(c, f, i, j int, e uint64)) {
		for i := 1; i <= m; i++ {
			for j := 1; j <= m; j++ {
				for _, s := range steps {
					do(free(i, j), free(i+s.i, j+s.j), i+s.i, j+s.j, uint64(3*(i*n+j+s.node)+s.kind))
				}
			}
		}
	}
	each(func(c, f, _, _ int, _ uint64) {
		if f > c {
			count++
		}
	})
	t := &net{n: m * m, pairs: make([][2]int32, 0, count)}
	each(func(c, f, _, _ int, _ uint64) {
		if f > c {
			t.pairs = append(t.pairs, [2]int32{int32(f), int32(c)})
		}
	})
	t.refill = func(values, b []float64, seed int) {
		clear(values)
		clear(b)
		for c := range t.n {
			b[3*c+2] = 0.05 / float64(t.n)
		}
		k := t.n
		each(func(c, f, i, j int, e uint64) {
			q := forceDensity(seed, e)
			values[c] += q
			switch {
			case f < 0:
				x, y := float64(j)/float64(n-1), float64(i)/float64(n-1)
				b[3*c] += q * x
				b[3*c+1] += q * y
				b[3*c+2] += q * (x*(1-x) - y*(1-y) + 0.3*x*y)
			case f > c:
				values[k] = -q
				k++
			}
		})
	}
	return t
}

// weighted is the system of a net of free nodes with the edges given, every
// hundredth node held by a spring. With three directions every edge has the
// stiffness q(0.1·I + d·dᵀ) for some direction d, as an elastic net has.
func weighted(nodes int, edges [][2]int32, directions int) *net {
	dirs := directions
	t := &net{n: nodes * dirs}
	at := func(i int32, d int) int32 { return i*int32(dirs) + int32(d) }
	if dirs == 1 {
		t.pairs = edges
	} else {
		for i := range int32(nodes) {
			t.pairs = append(t.pairs, [2]int32{at(i, 1), at(i, 0)}, [2]int32{at(i, 2), at(i, 0)}, [2]int32{at(i, 2), at(i, 1)})
		}
		for _, e := range edges {
			for a := range dirs {
				for b := range dirs {
					t.pairs = append(t.pairs, [2]int32{at(e[0], a), at(e[1], b)})
				}
			}
		}
	}
	t.refill = func(values, b []float64, seed int) {
		clear(values)
		for i := range b {
			b[i] = float64(i%7) - 3
		}
		for i := 0; i < nodes; i += 100 {
			for d := range dirs {
				values[at(int32(i), d)] += 1
			}
		}
		off := values[t.n:]
		for k, e := range edges {
			q := forceDensity(seed, uint64(k))
			if dirs == 1 {
				values[e[0]] += q
				values[e[1]] += q
				off[k] = -q
				continue
			}
			angle := 6.28 * forceDensity(0, uint64(k))
			d := [3]float64{math.Cos(angle) * 0.9, math.Sin(angle) * 0.9, math.Sqrt(1 - 0.81)}
			var s [3][3]float64
			for a := range 3 {
				for c := range 3 {
					s[a][c] = q * d[a] * d[c]
					off[3*nodes+9*k+3*a+c] = -s[a][c]
					if a == c {
						s[a][c] += 0.1 * q
						off[3*nodes+9*k+3*a+c] = -s[a][c]
						values[at(e[0], a)] += s[a][c]
						values[at(e[1], a)] += s[a][c]
					}
				}
			}
			for _, i := range e {
				off[3*i] += s[1][0]
				off[3*i+1] += s[2][0]
				off[3*i+2] += s[2][1]
			}
		}
	}
	return t
}

// radialEdges are rings of so many nodes each, joined by spokes that meet in
// node 0.
func radialEdges(rings, spokes int) [][2]int32 {
	var e [][2]int32
	at := func(r, s int) int32 { return int32(1 + r*spokes + s%spokes) }
	for r := range rings {
		for s := range spokes {
			e = append(e, [2]int32{at(r, s), at(r, s+1)})
			if r == 0 {
				e = append(e, [2]int32{0, at(0, s)})
			} else {
				e = append(e, [2]int32{at(r-1, s), at(r, s)})
			}
		}
	}
	return e
}

// polarNet has rings of 6k nodes around a centre, each node tied to its ring
// and to the nearest one or two nodes of the ring inside.
func polarNet(nodes int) *net {
	rings := int(math.Sqrt(float64(nodes) / 3))
	first := func(k int) int { return 1 + 3*k*(k-1) } // of ring k ≥ 1
	var e [][2]int32
	for k := 1; k <= rings; k++ {
		for s := range 6 * k {
			i := int32(first(k) + s)
			e = append(e, [2]int32{i, int32(first(k) + (s+1)%(6*k))})
			if k == 1 {
				e = append(e, [2]int32{i, 0})
				continue
			}
			in := 6 * (k - 1)
			lo := s * in / (6 * k)
			e = append(e, [2]int32{i, int32(first(k-1) + lo)})
			if s*in%(6*k) != 0 {
				e = append(e, [2]int32{i, int32(first(k-1) + (lo+1)%in)})
			}
		}
	}
	return weighted(first(rings+1), e, 1)
}

// delaunayEdges triangulates side² random points in the unit square. The nodes
// are numbered at random.
func delaunayEdges(side int) [][2]int32 {
	rng := rand.New(rand.NewPCG(7, uint64(side)))
	m := newTriangulation(side, rng)
	rename := rng.Perm(side * side)
	var e [][2]int32
	for _, t := range m.edges() {
		e = append(e, [2]int32{int32(rename[t[0]]), int32(rename[t[1]])})
	}
	return e
}

// dumpMatrix writes the lower triangle in Matrix Market form.
func dumpMatrix(name string, t *net) (err error) {
	file, err := os.Create(name)
	if err != nil {
		return err
	}
	defer func() {
		if e := file.Close(); err == nil {
			err = e
		}
	}()
	w := bufio.NewWriterSize(file, 1<<20)
	values, _ := t.fill(2)
	fmt.Fprintf(w, "%%%%MatrixMarket matrix coordinate real symmetric\n%d %d %d\n", t.n, t.n, t.n+len(t.pairs))
	var line []byte
	put := func(i, j int32, v float64) {
		line = strconv.AppendInt(line[:0], int64(max(i, j))+1, 10)
		line = strconv.AppendInt(append(line, ' '), int64(min(i, j))+1, 10)
		line = strconv.AppendFloat(append(line, ' '), v, 'g', -1, 64)
		w.Write(append(line, '\n'))
	}
	for i := range int32(t.n) {
		put(i, i, values[i])
	}
	for k, p := range t.pairs {
		put(p[0], p[1], values[t.n+k])
	}
	return w.Flush()
}
