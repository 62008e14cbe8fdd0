package export

import (
	"bytes"
	"encoding/xml"
	"fmt"
	"image/png"
	"io"
	"math"
	"regexp"
	"strings"
	"testing"

	"anticlast/formfind/canopy"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

func svgOf(t *testing.T, r *canopy.Result, o Options) string {
	t.Helper()
	var b bytes.Buffer
	require.NoError(t, writeSVG(background, &b, r, o))
	dec := xml.NewDecoder(bytes.NewReader(b.Bytes()))
	for {
		if _, err := dec.Token(); err == io.EOF {
			break
		} else {
			require.NoError(t, err, "well-formed")
		}
	}
	return b.String()
}

func TestDrawingsShowDimensionsForcesAndNames(t *testing.T) {
	r := sail(10)
	r.Title = `Quay <"market"> & sail`
	s := svgOf(t, r, Options{})
	lo, hi := canopy.Bounds(r.Form.Position)
	for _, want := range []string{">Plan<", ">Axonometric<", ">25.02 kN<", ">−58.40 kN<", ">G1 anchor<", "prestress achieved/specified", canopy.Caution,
		"&lt;&#34;market&#34;&gt; &amp; sail"} {
		require.Contains(t, s, want)
	}
	for _, extent := range []float64{hi.X - lo.X, hi.Y - lo.Y, hi.Z - lo.Z} {
		require.Contains(t, s, fmt.Sprintf(">%.2f m<", extent))
	}
}

func TestDrawingsOfOtherForms(t *testing.T) {
	all := scenes()
	all["large sail"], all["large net"] = sail(60), grid(110)
	for name, r := range all {
		s := svgOf(t, r, Options{PictureWidth: 400})
		plain := regexp.MustCompile(`base64,[^"]*`).ReplaceAllString(s, "")
		require.NotContains(t, plain, "NaN", name)
		require.NotContains(t, plain, "Inf", name)
		require.Less(t, len(s), 1<<20, name+": the size does not grow with the mesh")
	}
}

// What is under the fabric is dashed in plan, what is above is not.
func TestHiddenLines(t *testing.T) {
	for _, c := range []struct {
		z      float64
		hidden bool
	}{{-5, true}, {20, false}} {
		r := sail(10)
		s := r.Structure
		at := int32(len(s.Position))
		for _, x := range []float64{-1, 1} {
			s.Position = append(s.Position, r3.Vec{X: x, Z: c.z})
			s.Fixed = append(s.Fixed, 0)
			s.Held = append(s.Held, 0)
			r.Form.Reaction = append(r.Form.Reaction, r3.Vec{})
		}
		r.Form.Position = append([]r3.Vec(nil), s.Position...)
		d := draw(r, views()[0], quick)
		d.b.Reset()
		d.path([]r3.Vec{s.Position[at], s.Position[at+1]}, "cable", 1, false)
		require.Equal(t, c.hidden, strings.Contains(d.body(), "hidden"))
		require.Equal(t, 1, strings.Count(d.body(), "<path"))
	}
}

// Views are right-handed, keep lengths and show what is nearer in front.
func TestViews(t *testing.T) {
	for _, v := range views() {
		require.InDelta(t, 1, r3.Dot(r3.Cross(v.right, v.up), v.toward), 1e-12, v.name)
		for _, u := range []r3.Vec{v.right, v.up, v.toward} {
			require.InDelta(t, 1, r3.Norm(u), 1e-12, v.name)
		}
		require.GreaterOrEqual(t, v.up.Z, 0.0)
	}
	z := newZbuffer(10, 10)
	tri := func(depth, value float64) {
		z.triangle([3]point{{0, 0, depth}, {10, 0, depth}, {0, 10, depth}}, [3]float64{value, value, value})
	}
	tri(1, 5)
	tri(0, 7)
	require.Equal(t, float32(5), z.value[11])
	require.False(t, z.sees(point{1.5, 1.5, 0.5}, 0.1))
	require.True(t, z.sees(point{1.5, 1.5, 1.05}, 0.1))
	require.True(t, z.sees(point{9.5, 9.5, -9}, 0.1))
}

func TestPictureShowsFabricAndSaysTheCaution(t *testing.T) {
	for name, r := range scenes() {
		var b bytes.Buffer
		require.NoError(t, writePNG(background, &b, r, Options{PictureWidth: 400}), name)
		require.Contains(t, b.String(), canopy.Caution)
		m, err := png.Decode(&b)
		require.NoError(t, err)
		require.Equal(t, 400, m.Bounds().Dx())
		if len(r.Structure.Corners) == 0 {
			continue
		}
		ink := 0
		for y := m.Bounds().Min.Y; y < m.Bounds().Max.Y; y += 4 {
			for x := 0; x < 400; x += 4 {
				if r, g, b, _ := m.At(x, y).RGBA(); r&g&b != 0xffff {
					ink++
				}
			}
		}
		require.Greater(t, float64(ink)/float64(m.Bounds().Dy()*400/16), 0.02, name)
	}
}

func TestRoundLength(t *testing.T) {
	for _, c := range []struct{ v, want float64 }{{7, 5}, {4.9, 2}, {1.5, 1}, {0.3, 0.2}, {120, 100}, {0, 1}, {math.Inf(1), 1}} {
		require.InDelta(t, c.want, roundLength(c.v), 1e-12)
	}
}

func BenchmarkDrawings(b *testing.B) {
	r := sail(sweepN(70, 300, 700))
	for b.Loop() {
		if err := writeSVG(background, io.Discard, r, Options{}); err != nil {
			b.Fatal(err)
		}
	}
}

// North is turned clockwise from y, which points up in the plan, as angles are
// in SVG. Without it there is no arrow.
func TestPlanHasANorthArrowWhereNorthIsKnown(t *testing.T) {
	r := sail(6)
	var b bytes.Buffer
	require.NoError(t, writeSVG(background, &b, r, Options{PictureWidth: 200}))
	require.NotContains(t, b.String(), `class="north"`)
	north := math.Pi / 2 // the tip is to the right
	r.North = &north
	b.Reset()
	require.NoError(t, writeSVG(background, &b, r, Options{PictureWidth: 200}))
	require.Equal(t, 1, strings.Count(b.String(), `class="north"`), "in the plan only")
	require.Contains(t, b.String(), `rotate(90)" d="M0 18V-18`)
	require.Contains(t, b.String(), `x="26" y="4" font-size="12" text-anchor="middle">N<`)
}
