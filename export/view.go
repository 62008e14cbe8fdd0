package export

import (
	"math"

	"anticlast/formfind/canopy"

	"gonum.org/v1/gonum/spatial/r3"
)

// A view looks at the model in parallel projection.
type view struct {
	name, title       string
	right, up, toward r3.Vec // unit vectors; toward points at the viewer
}

// views are the drawings of a form, the plan first.
func views() []view {
	x, y, z := r3.Vec{X: 1}, r3.Vec{Y: 1}, r3.Vec{Z: 1}
	return []view{
		{"plan", "Plan", x, y, z},
		{"front", "Elevation, seen along +y", x, z, r3.Scale(-1, y)},
		{"side", "Elevation, seen along −x", y, z, x},
		axonometric(-60, 30),
	}
}

// axonometric looks from an azimuth (degrees from x towards y) and an elevation
// (degrees above the horizon).
func axonometric(azimuth, elevation float64) view {
	a, e := azimuth*math.Pi/180, elevation*math.Pi/180
	toward := r3.Vec{X: math.Cos(e) * math.Cos(a), Y: math.Cos(e) * math.Sin(a), Z: math.Sin(e)}
	right := r3.Vec{X: -math.Sin(a), Y: math.Cos(a)}
	return view{"axonometric", "Axonometric", right, r3.Cross(toward, right), toward}
}

// frame places a view on paper: x to the right, y down, in units of the paper.
type frame struct {
	view
	centre        r3.Vec // of the model
	scale         float64
	x, y          float64 // where the centre falls
	width, height float64
}

// point is a place on paper with its depth in m, larger nearer to the viewer.
type point struct{ x, y, depth float64 }

func (f *frame) at(p r3.Vec) point {
	d := r3.Sub(p, f.centre)
	return point{f.x + f.scale*r3.Dot(d, f.right), f.y - f.scale*r3.Dot(d, f.up), r3.Dot(d, f.toward)}
}

// fit makes the frame for paper of the given width and at most the given height,
// with margins around the model.
func fit(r *canopy.Result, v view, width, most, margin float64) *frame {
	lo, hi := canopy.Bounds(r.Form.Position)
	f := &frame{view: v, centre: r3.Scale(0.5, r3.Add(lo, hi)), scale: 1, width: width}
	left, right, top, bottom := math.Inf(1), math.Inf(-1), math.Inf(1), math.Inf(-1)
	for _, p := range r.Form.Position {
		q := f.at(p)
		left, right = min(left, q.x), max(right, q.x)
		top, bottom = min(top, q.y), max(bottom, q.y)
	}
	if len(r.Form.Position) == 0 {
		left, right, top, bottom = 0, 0, 0, 0
	}
	w, h := max(right-left, 1e-9), max(bottom-top, 1e-9)
	f.scale = min((width-2*margin)/w, (most-2*margin)/h)
	f.height = f.scale*h + 2*margin
	f.x = width/2 - f.scale*(left+right)/2
	f.y = f.height/2 - f.scale*(top+bottom)/2
	return f
}

// zoomed is the frame on finer paper.
func (f *frame) zoomed(k float64) *frame {
	g := *f
	g.scale *= k
	g.x *= k
	g.y *= k
	g.width *= k
	g.height *= k
	return &g
}

// zbuffer keeps for each pixel the nearest point of the fabric and its value.
type zbuffer struct {
	w, h  int
	depth []float32 // −Inf where there is nothing
	value []float32
}

func newZbuffer(w, h int) *zbuffer {
	z := &zbuffer{w: w, h: h, depth: make([]float32, w*h), value: make([]float32, w*h)}
	for i := range z.depth {
		z.depth[i] = float32(math.Inf(-1))
	}
	return z
}

// triangle draws a triangle with a value at each corner. Pixels whose centre is
// inside belong to it.
func (z *zbuffer) triangle(p [3]point, v [3]float64) {
	area := (p[1].x-p[0].x)*(p[2].y-p[0].y) - (p[2].x-p[0].x)*(p[1].y-p[0].y)
	if area == 0 {
		return
	}
	x0 := max(0, int(math.Ceil(min(p[0].x, p[1].x, p[2].x)-0.5)))
	x1 := min(z.w-1, int(math.Floor(max(p[0].x, p[1].x, p[2].x)-0.5)))
	y0 := max(0, int(math.Ceil(min(p[0].y, p[1].y, p[2].y)-0.5)))
	y1 := min(z.h-1, int(math.Floor(max(p[0].y, p[1].y, p[2].y)-0.5)))
	const slack = -1e-9 // neighbours leave no gap
	for y := y0; y <= y1; y++ {
		for x := x0; x <= x1; x++ {
			cx, cy := float64(x)+0.5, float64(y)+0.5
			b := ((cx-p[0].x)*(p[2].y-p[0].y) - (p[2].x-p[0].x)*(cy-p[0].y)) / area
			c := ((p[1].x-p[0].x)*(cy-p[0].y) - (cx-p[0].x)*(p[1].y-p[0].y)) / area
			a := 1 - b - c
			if a < slack || b < slack || c < slack {
				continue
			}
			d := float32(a*p[0].depth + b*p[1].depth + c*p[2].depth)
			if i := y*z.w + x; d > z.depth[i] {
				z.depth[i] = d
				z.value[i] = float32(a*v[0] + b*v[1] + c*v[2])
			}
		}
	}
}

// sees reports whether a point is not behind the fabric, by more than a
// tolerance in m.
func (z *zbuffer) sees(p point, tolerance float64) bool {
	x, y := int(p.x), int(p.y)
	if x < 0 || y < 0 || x >= z.w || y >= z.h {
		return true
	}
	return float64(z.depth[y*z.w+x]) <= p.depth+tolerance
}

// fabricIn draws the fabric with the values of a layer into a buffer of the
// frame's paper.
func fabricIn(r *canopy.Result, f *frame, l *layer) *zbuffer {
	z := newZbuffer(int(math.Ceil(f.width)), int(math.Ceil(f.height)))
	for _, m := range sheets(r) {
		values := m.atVertices(l.value)
		paper := make([]point, len(m.node))
		for i, v := range m.node {
			paper[i] = f.at(r.Form.Position[v])
		}
		for _, c := range m.corners {
			z.triangle([3]point{paper[c[0]], paper[c[1]], paper[c[2]]}, [3]float64{values[c[0]], values[c[1]], values[c[2]]})
		}
	}
	return z
}
