package spec_test

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"anticlast/formfind/canopy"
	"anticlast/formfind/spec"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
)

// sail is a small drawn model with room for more keys at its end.
const sail = `anticlast: 1
points:
  A: [0, 0, 3]
  B: {x: 8, y: 0, z: 5500 mm}
  C: [8, 8, 3]
  D: [0, 8, 5]
edges:
  AB: {from: A, to: B, cable: &edge {force: 20 kN}}
  BC: {from: B, to: C, cable: *edge}
  CD: {from: C, to: D, cable: *edge}
  DA: {from: D, to: A, cable: *edge}
fabrics:
  main: {boundary: [AB, BC, CD, DA], prestress: 2 kN/m}
`

// readErr reads text that must fail and returns the list.
func readErr(t testing.TB, text string, o spec.Options) []spec.Diagnostic {
	t.Helper()
	m, err := spec.Read(context.Background(), spec.Input(strings.NewReader(text), t.TempDir()), o)
	require.Nil(t, m)
	var all *spec.Errors
	require.True(t, errors.As(err, &all), "%v", err)
	return all.List
}

func TestNorthIsAnAngleOrNotKnown(t *testing.T) {
	const points = "\npoints: {A: [0, 0, 0], B: [1, 0, 0]}\nedges: {AB: {from: A, to: B, cable: {force: 1 kN}}}\n"
	require.Nil(t, read(t, "anticlast: 1"+points).North)
	m := read(t, "anticlast: 1\nnorth: -10 deg"+points)
	require.NotNil(t, m.North)
	require.InDelta(t, -10*math.Pi/180, *m.North, 1e-15)
	require.Zero(t, *read(t, "anticlast: 1\nnorth: 0"+points).North)
}

func TestDrawnModelIsReadInSI(t *testing.T) {
	m := read(t, `anticlast: 1
title: Kiosk
description: |
  Two lines
  of text.
mesh: 40 cm
self weight: true
points:
  A: [0, 0, 3]
  B: {x: 8, y: 0, z: 5500 mm, hold: held, load: [0, 0, -2 kN]}
  C: {x: 8 m, y: 8, z: 3, support: [x, z]}
  D: {x: 0, y: 8, z: 5, hold: free}
  F: [8, 0, 0]
  G: [11, -3, 0]
  P: [4, 4, 7]
edges:
  AB: {from: A, to: B, cable: {sag: 10 %}, segments: 12}
  BC: {from: B, to: C, fixed: {through: [8, 4, 6]}, arch: true}
  CD: {from: C, to: D}
  DA: {from: D, to: A}
  PA: {from: P, to: A, cable: {stiffness: 12 MN, unstressed: 8 m, weight: 1 kg/m, strength: 100 kN}}
cables:
  K: {edges: [CD, DA], force density: 3 kN/m, clamped: [D], role: valley}
fabrics:
  main:
    boundary: [AB, BC, CD, DA]
    prestress: {warp: 2 kN/m, weft: 3 N/mm}
    warp: {from: A, to: C}
    ring: top
    mesh: 200 mm
    strength: 4000 N/5cm
    weight: 1050 g/m2
    stiffness: {warp: 600 kN/m, weft: 500 kN/m, shear: 30 kN/m, poisson: 0.3}
    pressure: 3 mbar
rings:
  top: {at: P, radius: 600 mm, free: [z], weight: 120 kg}
masts:
  M: {foot: F, head: B}
guys:
  G: {from: B, to: G, force: 12 kN, strength: 0.2 MN}
limits:
  achieved: [90 %, 1.1]
  ratio: [0.8, 1.25]
  stress min: 1
  stress max: 6 kN/m
  cable max: 80
  slope min: 100 %
  reaction max: 120 kN
  utilisation: 100 %
  headroom: [{height: 2.5, region: [[0, 0], [4, 0], [4, 300 cm]]}]
factors: {load: 1.5, fabric: 4, cable: 1.65}
`)
	require.Equal(t, "Kiosk", m.Title)
	require.Equal(t, "Two lines\nof text.\n", m.Description)
	require.Equal(t, "-", m.File)
	require.Equal(t, 0.4, m.MeshSize)
	require.True(t, m.SelfWeight)
	require.Equal(t, []canopy.Point{
		{Name: "A", At: r3.Vec{Z: 3}, Line: 9},
		{Name: "B", At: r3.Vec{X: 8, Z: 5.5}, Hold: canopy.HoldHeld, Load: r3.Vec{Z: -2000}, Line: 10},
		{Name: "C", At: r3.Vec{X: 8, Y: 8, Z: 3}, Hold: canopy.HoldAnchored, Fixed: canopy.DirX | canopy.DirZ, Line: 11},
		{Name: "D", At: r3.Vec{Y: 8, Z: 5}, Hold: canopy.HoldFree, Line: 12},
		{Name: "F", At: r3.Vec{X: 8}, Line: 13},
		{Name: "G", At: r3.Vec{X: 11, Y: -3}, Line: 14},
		{Name: "P", At: r3.Vec{X: 4, Y: 4, Z: 7}, Line: 15},
	}, m.Points)
	require.Equal(t, []canopy.Edge{
		{Name: "AB", From: "A", To: "B", Kind: canopy.EdgeCable, Role: canopy.KindEdgeCable, Cable: "AB", Segments: 12, Line: 17},
		{Name: "BC", From: "B", To: "C", Arch: true, Arc: true, Through: r3.Vec{X: 8, Y: 4, Z: 6}, Line: 18},
		{Name: "CD", From: "C", To: "D", Kind: canopy.EdgeCable, Role: canopy.KindValleyCable, Cable: "K", Line: 19},
		{Name: "DA", From: "D", To: "A", Kind: canopy.EdgeCable, Role: canopy.KindValleyCable, Cable: "K", Line: 20},
		{Name: "PA", From: "P", To: "A", Kind: canopy.EdgeCable, Role: canopy.KindCable, Cable: "PA", Line: 21},
	}, m.Edges)
	require.Equal(t, []canopy.ModelCable{
		{Name: "AB", Edges: []string{"AB"}, Sag: 0.1, Line: 17},
		{Name: "PA", Edges: []string{"PA"}, Stiffness: 12e6, Unstressed: 8, Weight: 9.80665, Strength: 100e3, Line: 21},
		{Name: "K", Edges: []string{"CD", "DA"}, ForceDensity: 3000, Clamped: []string{"D"}, Line: 23},
	}, m.Cables)
	d := math.Sqrt(0.5)
	require.Len(t, m.Fabrics, 1)
	f := m.Fabrics[0]
	require.InDelta(t, d, f.WarpDir.X, 1e-15)
	require.InDelta(t, d, f.WarpDir.Y, 1e-15)
	f.WarpDir = r3.Vec{}
	require.Equal(t, canopy.ModelFabric{
		Name: "main", Boundary: []string{"AB", "BC", "CD", "DA"}, Ring: "top", Warp: 2000, Weft: 3000, MeshSize: 0.2, Line: 25,
		Properties: canopy.Fabric{Name: "main", WarpModulus: 600e3, WeftModulus: 500e3, ShearModulus: 30e3, PoissonWarpWeft: 0.3,
			WarpStrength: 80e3, WeftStrength: 80e3, Weight: 1.05 * 9.80665, Pressure: 300},
	}, f)
	require.Equal(t, []canopy.ModelRing{{Name: "top", At: "P", Radius: 0.6, Axis: r3.Vec{Z: 1}, Rigid: true, Free: canopy.DirZ, Weight: 120 * 9.80665, Line: 36}}, m.Rings)
	require.Equal(t, []canopy.Stay{
		{Name: "M", Mast: true, From: "F", To: "B", Line: 38},
		{Name: "G", From: "B", To: "G", Force: 12e3, HasForce: true, Strength: 200e3, Line: 40},
	}, m.Stays)
	l := m.Limits
	require.Equal(t, [2]float64{0.9, 1.1}, *l.Achieved)
	require.Equal(t, [2]float64{0.8, 1.25}, *l.Ratio)
	require.Equal(t, []float64{1000, 6000, 80e3, math.Pi / 4, 120e3, 1}, []float64{*l.StressMin, *l.StressMax, *l.CableMax, *l.SlopeMin, *l.ReactionMax, *l.Utilisation})
	require.Equal(t, []canopy.Headroom{{Name: "1", Height: 2.5, Region: []r3.Vec{{}, {X: 4}, {X: 4, Y: 3}}}}, l.Headroom)
	require.Equal(t, canopy.Factors{Load: 1.5, Fabric: 4, Cable: 1.65}, m.Factors)
}

func TestNetAndCableRing(t *testing.T) {
	m := read(t, strings.Replace(sail, "fabrics:\n", `nets:
  roof:
    boundary: [DA, CD, BC, AB]
    families:
      - {name: bearing, spacing: 900 mm, force: 5}
      - {spacing: 1.2, force density: 4, stiffness: 8 MN, weight: 6 N/m, strength: 60}
fabrics:
`, 1)+`    # two patches may share edges
`, "fabrics.main.warp=[0, 2, 0]")
	require.Equal(t, []canopy.Net{{Name: "roof", Boundary: []string{"DA", "CD", "BC", "AB"}, Line: 13, Families: []canopy.Family{
		{Name: "bearing", Spacing: 0.9, Force: 5000},
		{Spacing: 1.2, ForceDensity: 4000, Stiffness: 8e6, Weight: 6, Strength: 60e3},
	}}}, m.Nets)
	require.Equal(t, r3.Vec{Y: 1}, m.Fabrics[0].WarpDir)
}

func TestNetPatterns(t *testing.T) {
	m := read(t, `anticlast: 1
points: {A: [0, 0, 3], B: [9, 0, 5], C: [9, 9, 3], D: [0, 9, 5], P: {x: 3, y: 3, z: 4, hold: free}, Q: {x: 6, y: 3, z: 4, hold: free}, R: {x: 4, y: 6, z: 4, hold: free}}
edges:
  AB: {from: A, to: B, cable: &rim {mean force: 90 kN}}
  BC: {from: B, to: C, cable: *rim}
  CD: {from: C, to: D, cable: *rim}
  DA: {from: D, to: A, cable: *rim}
  PQ: {from: P, to: Q, cable: *rim}
  QR: {from: Q, to: R, cable: *rim}
  RP: {from: R, to: P, cable: *rim}
nets:
  cage: {boundary: [AB, BC, CD, DA], holes: [[PQ, QR, RP]], pattern: straight, direction: {from: A, to: B}, equal mesh: {length: 600 mm, at tension: 5},
    families: [{mean force: 5, stiffness: 8 MN}, {angle: 75 deg, force: 6, stiffness: 8 MN}]}
`)
	require.Equal(t, []canopy.Net{{
		Name: "cage", Boundary: []string{"AB", "BC", "CD", "DA"}, Holes: [][]string{{"PQ", "QR", "RP"}}, Pattern: canopy.NetStraight,
		Direction: r3.Unit(r3.Vec{X: 9, Z: 2}), MeshLength: 0.6, MarkTension: 5000, Line: 12,
		Families: []canopy.Family{{MeanForce: 5000, Stiffness: 8e6}, {Angle: 75 * math.Pi / 180, HasAngle: true, Force: 6000, Stiffness: 8e6}},
	}}, m.Nets)
	require.Equal(t, 90e3, m.Cables[0].MeanForce)
	require.Equal(t, canopy.KindEdgeCable, m.Edges[4].Role)
}

func TestUnits(t *testing.T) {
	for _, c := range []struct {
		text string
		dim  *spec.Dimension
		want float64
	}{
		{"2", spec.Length, 2}, {"700 mm", spec.Length, 0.7}, {"12.5cm", spec.Length, 0.125}, {"1.5 km", spec.Length, 1500},
		{"25", spec.Force, 25e3}, {"25 kN", spec.Force, 25e3}, {"1e3 N", spec.Force, 1e3}, {"-2 MN", spec.Force, -2e6}, {".5 GN", spec.Force, 5e8},
		{"2.5", spec.ForcePerLength, 2500}, {"2.5 N/mm", spec.ForcePerLength, 2500}, {"400 daN/5cm", spec.ForcePerLength, 80e3}, {"4000 N/5cm", spec.ForcePerLength, 80e3}, {"25 N/cm", spec.ForcePerLength, 2500},
		{"10 N/m2", spec.WeightPerArea, 10}, {"0.01", spec.WeightPerArea, 10}, {"1 kg/m²", spec.WeightPerArea, 9.80665}, {"10 N/m^2", spec.WeightPerArea, 10},
		{"2 kg/m", spec.WeightPerLength, 19.6133}, {"1 t", spec.Weight, 9806.65},
		{"300 Pa", spec.Pressure, 300}, {"0.3 kPa", spec.Pressure, 300}, {"3 mbar", spec.Pressure, 300}, {"0.3 kN/m2", spec.Pressure, 300}, {"0.3", spec.Pressure, 300},
		{"8 %", spec.Ratio, 0.08}, {"0.08", spec.Ratio, 0.08}, {"8percent", spec.Ratio, 0.08},
		{"180", spec.Angle, math.Pi}, {"90°", spec.Angle, math.Pi / 2}, {"90 degrees", spec.Angle, math.Pi / 2}, {"1 rad", spec.Slope, 1},
		{"100 %", spec.Slope, math.Pi / 4}, {"45", spec.Slope, math.Pi / 4},
	} {
		got, err := spec.ParseQuantity(c.text, c.dim)
		require.NoError(t, err, c.text)
		require.InEpsilon(t, c.want, got, 1e-15, c.text)
	}
	// A tenth of a metre is 0.1 to the last bit, whatever the unit.
	for i := range 1000 {
		want := float64(i) / 1000
		got, err := spec.ParseQuantity(fmt.Sprintf("%d mm", i), spec.Length)
		require.NoError(t, err)
		require.Equal(t, want, got)
	}
	for _, s := range []string{"", "kN", "2.5.1 m", "1 2 m", "2 m m", "2 /m", "1e m", "∞", "−3 m", "3;"} {
		_, err := spec.ParseQuantity(s, spec.Length)
		require.Error(t, err, s)
	}
}

func TestSetChangesOneRun(t *testing.T) {
	m := read(t, sail, "points.A.z=7.5", "points.B.z=8", "points.C=[8, 8, 2 m]", "edges.BC.cable.force=30 kN",
		"limits.slope_min=5 deg", "mesh=300 mm", "fabrics.main.boundary.0=AB", "points.D.1=9", "fabrics.main.stiffness={warp: 3 MN/m, weft: 2 MN/m}")
	require.Equal(t, 7.5, m.Points[0].At.Z)
	require.Equal(t, 8.0, m.Points[1].At.Z)
	require.Equal(t, 2.0, m.Points[2].At.Z)
	require.Equal(t, 9.0, m.Points[3].At.Y)
	require.Equal(t, 30e3, m.Cables[1].Force)
	for _, i := range []int{0, 2, 3} {
		require.Equal(t, 20e3, m.Cables[i].Force, "aliases of a changed value keep theirs")
	}
	require.InDelta(t, 5*math.Pi/180, *m.Limits.SlopeMin, 1e-15)
	require.Equal(t, 0.3, m.MeshSize)
	require.Equal(t, 3e6, m.Fabrics[0].Properties.WarpModulus)
}

func TestSetErrorsPointAtTheSet(t *testing.T) {
	for set, want := range map[string]string{
		"points.E.z=1":                      `--set points.E.z=1: there is no "E" in points; points has A, B, C and D`,
		"point.A.z=1":                       `--set point.A.z=1: there is no "point" in the model; did you mean "points"?`,
		"points.A.z=1 kN":                   `--set points.A.z=1 kN: "1 kN" is a force, not a length; a length is written in m, mm, cm or km`,
		"fabrics.main.boundary.7=AB":        `--set fabrics.main.boundary.7=AB: there is no "7" in the list fabrics.main.boundary; positions are counted from 0 to 3`,
		"title=[":                           `--set title=[: "[" is not a value; write it as in the model file, for example points.M1.z=7.5`,
		"mesh=*edge":                        `--set mesh=*edge: "*edge" is not a value; write it as in the model file, for example points.M1.z=7.5`,
		"edges.AB.from=E":                   `--set edges.AB.from=E: point "E" is not defined; the points are A, B, C and D`,
		"edges.AB.cable.sag=8 %":            `--set edges.AB.cable.sag=8 %: the force of the cable of edge "AB" is decided twice, by force and sag; set them together: edges.AB.cable={sag: …}`,
		"limits.headroom.0.height=3":        `--set limits.headroom.0.height=3: there is no "0" in limits.headroom`,
		"fabrics.main.prestress.warp=1kN/m": `--set fabrics.main.prestress.warp=1kN/m: fabrics.main.prestress is a single value and has no "warp"; set it as a whole`,
	} {
		list := readErr(t, sail, spec.Options{Set: []string{set}})
		require.Contains(t, list[0].String(), want)
		require.Zero(t, list[0].Line)
	}
}

func TestMergeKeys(t *testing.T) {
	m := read(t, strings.Replace(sail, "*edge}\n  CD", "{<<: *edge, force: 25 kN, strength: 90 kN}}\n  CD", 1))
	require.Equal(t, 25e3, m.Cables[1].Force)
	m = read(t, strings.Replace(sail, "*edge}\n  CD", "{<<: [*edge], strength: 90 kN}}\n  CD", 1))
	require.Equal(t, 20e3, m.Cables[1].Force)
	require.Equal(t, 90e3, m.Cables[1].Strength)
}

func TestAllErrorsAtOnce(t *testing.T) {
	text := strings.NewReplacer("force: 20 kN", "force: 20 kM", "[8, 8, 3]", "[8, 8]", "to: A", "to: Z", "prestress", "prestres").Replace(sail)
	list := readErr(t, text, spec.Options{})
	require.Len(t, list, 4)
	for i := range list[1:] {
		require.LessOrEqual(t, list[i].Line, list[i+1].Line, "in order of lines")
	}
	require.Equal(t, spec.Diagnostic{File: "-", Line: 8, Column: 45, Path: "edges.AB.cable.force", Text: "20 kM",
		Message: `unknown unit "kM" in "20 kM"`, Hint: "a force is written in kN, N, MN or GN"}, list[1])
}

func TestWarnings(t *testing.T) {
	text := strings.Replace(sail, "  D: ", "  E: [1, 1, 1]\n  D: ", 1) + "rings:\n  top: {at: A, radius: 1 m}\n"
	text = strings.Replace(text, "prestress: 2 kN/m", "prestress: 2000, weight: 10", 1)
	var got []string
	_, err := spec.Read(context.Background(), spec.Input(strings.NewReader(text), "."), spec.Options{Warn: func(d spec.Diagnostic) { got = append(got, d.String()) }})
	require.NoError(t, err)
	require.Len(t, got, 4)
	require.Contains(t, got[0], `-:6:3: point "E" is not used`)
	require.Contains(t, got[1], "a prestress of 2000 kN/m is more than any fabric carries")
	require.Contains(t, got[2], `a fabric of "10" is heavier than any`)
	require.Contains(t, got[3], `ring "top" is in no fabric`)

	got = nil
	text = strings.NewReplacer("  D: ", "  E: [0, 0, 3]\n  D: ", "fabrics:", "  EC: {from: E, to: C, cable: {force: 1}}\nfabrics:").Replace(sail)
	_, err = spec.Read(context.Background(), spec.Input(strings.NewReader(text), "."), spec.Options{Warn: func(d spec.Diagnostic) { got = append(got, d.String()) }})
	require.NoError(t, err)
	require.Equal(t, []string{`-:6:3: point "E" is at the same place as "A", but not connected to it; use one point for both`}, got)
}

func TestDigestCoversAllBytesRead(t *testing.T) {
	sum := func(parts ...string) string {
		h := sha256.Sum256([]byte(strings.Join(parts, "")))
		return "sha256:" + hex.EncodeToString(h[:])
	}
	require.Equal(t, sum(sail), read(t, sail).Digest)
	require.Equal(t, sum(sail, "\n--set mesh=1"), read(t, sail, "mesh=1").Digest)

	dir := t.TempDir()
	nodes, members := "name,x,y,z\na,0,0,0\nb,1,0,0\nc,2,0,0\n", "from,to,force\na,b,1\nb,c,1\n"
	model := "anticlast: 1\nlisted: {members: tables/members.csv, nodes: nodes.csv, supports: [{node: a}, {node: c}]}\n"
	require.NoError(t, os.Mkdir(filepath.Join(dir, "tables"), 0o755))
	for name, text := range map[string]string{"nodes.csv": nodes, "tables/members.csv": members, "m.yaml": model} {
		require.NoError(t, os.WriteFile(filepath.Join(dir, name), []byte(text), 0o644))
	}
	m, err := spec.Read(context.Background(), spec.File(filepath.Join(dir, "m.yaml")), spec.Options{})
	require.NoError(t, err)
	require.Equal(t, sum(model, nodes, members), m.Digest)
	require.Equal(t, "m.yaml", m.File)
}

func TestTablesStayInTheFolder(t *testing.T) {
	outside, dir := t.TempDir(), t.TempDir()
	secret := filepath.Join(outside, "nodes.csv")
	require.NoError(t, os.WriteFile(secret, []byte("x,y,z\n0,0,0\n1,0,0\n"), 0o644))
	link := filepath.Join(dir, "link.csv")
	require.NoError(t, os.Symlink(secret, link))
	rel, err := filepath.Rel(dir, secret)
	require.NoError(t, err)
	model := func(name string) spec.Source {
		return spec.Input(strings.NewReader("anticlast: 1\nlisted: {nodes: '"+name+"', supports: [{node: 0}], members: [{from: 0, to: 1, force: 1}]}\n"), dir)
	}
	for _, name := range []string{secret, rel, "link.csv", "./../x.csv", `..\x.csv`, `C:\x.csv`, ".", "/dev/zero"} {
		_, err := spec.Read(context.Background(), model(name), spec.Options{})
		var all *spec.Errors
		require.True(t, errors.As(err, &all), "%s: %v", name, err)
		require.Len(t, all.List, 1, "%s: %v", name, err)
	}
	for _, name := range []string{secret, rel, "link.csv"} {
		m, err := spec.Read(context.Background(), model(name), spec.Options{AnyFolder: true})
		require.NoError(t, err)
		require.Len(t, m.Listed.Position, 2)
	}
}

func TestManyTableErrorsAreCounted(t *testing.T) {
	var b strings.Builder
	b.WriteString("anticlast: 1\nlisted:\n  supports: [{node: 0}]\n  members: [{from: 0, to: 1, force: 1}]\n  nodes: |\n    x, y, z\n")
	for range 57 {
		b.WriteString("    1, 2, q\n")
	}
	_, err := spec.Read(context.Background(), spec.Input(strings.NewReader(b.String()), "."), spec.Options{})
	var all *spec.Errors
	require.True(t, errors.As(err, &all))
	require.Len(t, all.List, 20)
	require.Equal(t, 37, all.More)
	require.True(t, strings.HasSuffix(err.Error(), "\n… and 37 more"))
}

func TestReadingEnds(t *testing.T) {
	t.Run("cancelled", func(t *testing.T) {
		ctx, cancel := context.WithCancel(context.Background())
		cancel()
		_, err := spec.Read(ctx, spec.Input(strings.NewReader(sail), "."), spec.Options{})
		require.ErrorIs(t, err, context.Canceled)
	})
	t.Run("no file", func(t *testing.T) {
		_, err := spec.Read(context.Background(), spec.File(filepath.Join(t.TempDir(), "none.yaml")), spec.Options{})
		require.ErrorIs(t, err, os.ErrNotExist)
	})
	t.Run("folder", func(t *testing.T) {
		_, err := spec.Read(context.Background(), spec.File(t.TempDir()), spec.Options{})
		require.ErrorContains(t, err, "is a folder")
	})
	t.Run("too large", func(t *testing.T) {
		list := readErr(t, sail, spec.Options{MaxBytes: 100})
		require.Contains(t, list[0].Message, "larger than 100 bytes")
	})
	t.Run("empty", func(t *testing.T) {
		for _, s := range []string{"", " \n\t\n", "---\n", "\ufeff"} {
			list := readErr(t, s, spec.Options{})
			require.Len(t, list, 1, "%q", s)
		}
	})
	t.Run("utf-16", func(t *testing.T) {
		list := readErr(t, "\xff\xfea\x00", spec.Options{})
		require.Contains(t, list[0].String(), "UTF-16")
	})
	t.Run("alias bomb", func(t *testing.T) {
		var b strings.Builder
		b.WriteString("anticlast: 1\nlisted: {nodes: [], supports: []}\nfactors: &a0 {load: 1}\n")
		b.WriteString("points: &b0 {<<: [*a0, *a0]}\n")
		for i := 1; i < 30; i++ {
			fmt.Fprintf(&b, "k%d: &b%d {<<: [*b%d, *b%d, *b%d]}\n", i, i, i-1, i-1, i-1)
		}
		readErr(t, b.String(), spec.Options{Set: []string{"mesh=1"}})
		readErr(t, b.String(), spec.Options{})
	})
	t.Run("alias of itself", func(t *testing.T) {
		readErr(t, "anticlast: 1\npoints: &p\n  A: *p\n", spec.Options{})
		readErr(t, "anticlast: 1\npoints: &p\n  A: *p\n", spec.Options{Set: []string{"points.A.A.A.z=3"}})
		readErr(t, "anticlast: 1\npoints: &p\n  <<: *p\n", spec.Options{})
	})
}

func TestBoundariesThatPassFarApartDoNotCross(t *testing.T) {
	// A steep twisted panel crosses itself in plan only.
	read(t, strings.NewReplacer("[0, 0, 3]", "[0, 0, 0]", "{x: 8, y: 0, z: 5500 mm}", "[1, 1, 0]", "[8, 8, 3]", "[1, 0, 5]", "[0, 8, 5]", "[0, 1, 5]").Replace(sail))
	// A wall.
	read(t, strings.NewReplacer("[0, 0, 3]", "[0, 0, 0]", "{x: 8, y: 0, z: 5500 mm}", "[0, 8, 0]", "[8, 8, 3]", "[0, 8, 5]", "[0, 8, 5]", "[0, 0, 5]").Replace(sail))
}

// Turning, moving and scaling a model changes no verdict on its boundary.
func TestCrossingDoesNotDependOnPlace(t *testing.T) {
	corners := []r3.Vec{{Z: 3}, {X: 8, Z: 5}, {X: 8, Y: 8, Z: 3}, {Y: 8, Z: 5}}
	crossed := []r3.Vec{corners[0], corners[2], corners[1], corners[3]}
	for turn := range 5 {
		for _, scale := range []float64{1e-2, 1, 1e3} {
			for _, move := range []r3.Vec{{}, {X: 1e5, Y: -3e4, Z: 200}} {
				s, c := math.Sincos(float64(turn) * math.Pi / 2.3)
				model := func(p []r3.Vec) string {
					var b strings.Builder
					b.WriteString("anticlast: 1\npoints:\n")
					for i, v := range p {
						v = r3.Add(move, r3.Scale(scale, r3.Vec{X: c*v.X - s*v.Y, Y: s*v.X + c*v.Y, Z: v.Z}))
						fmt.Fprintf(&b, "  %c: [%.17g, %.17g, %.17g]\n", 'A'+i, v.X, v.Y, v.Z)
					}
					b.WriteString(sail[strings.Index(sail, "edges:"):])
					return b.String()
				}
				read(t, model(corners))
				list := readErr(t, model(crossed), spec.Options{})
				require.Contains(t, list[0].Message, "crosses itself")
			}
		}
	}
}

func TestListedTables(t *testing.T) {
	dir := t.TempDir()
	for name, text := range map[string]string{
		"nodes.csv":     "# a comment\r\nName;x [mm];y [cm];z\r\n\"p\";0;0;0\r\nq;4000;0;0\r\n\r\nr;2000;100;1\r\n",
		"members.csv":   "from,to,kind,force_density [N/m],Force,unstressed,stiffness,weight [kg/m],group,cable,name\np,r,edge cable,3000,,,,1,g1,K,\nr,q,edge cable,3000,,,12 MN,,g1,K,second\np,q,strut,,-5,,,,g2,,\np,r,,,,2.2,8000,,,,\n",
		"triangles.csv": "a,b,c,warp,weft,warp x,warp y\np,q,r,,,,\nq,r,p,3,4,0,2\n",
	} {
		require.NoError(t, os.WriteFile(filepath.Join(dir, name), []byte(text), 0o644))
	}
	text := `anticlast: 1
self weight: true
listed:
  nodes: nodes.csv
  members: members.csv
  triangles: triangles.csv
  supports:
    - {node: p}
    - {node: q, directions: yz}
  loads:
    - {node: r, fz: -2 kN}
    - {node: r, fx: 500 N, fz: -1}
  fabrics:
    main: {prestress: 2 kN/m, weight: 10 N/m2, strength: {warp: 80, weft: 70}}
`
	m, err := spec.Read(context.Background(), spec.Input(strings.NewReader(text), dir), spec.Options{Warn: func(d spec.Diagnostic) { t.Error(d) }})
	require.NoError(t, err)
	s := m.Listed
	require.Equal(t, []r3.Vec{{}, {X: 4}, {X: 2, Y: 1, Z: 1}}, s.Position)
	require.Equal(t, "r", s.NodeName.At(2))
	require.Equal(t, []canopy.Freedom{canopy.DirAll, canopy.DirY | canopy.DirZ, 0}, s.Fixed)
	require.Equal(t, []r3.Vec{{}, {}, {X: 500, Z: -3000}}, s.Load)
	require.Equal(t, [][2]int32{{0, 2}, {2, 1}, {0, 1}, {0, 2}}, s.Ends)
	require.Equal(t, []canopy.Kind{canopy.KindEdgeCable, canopy.KindEdgeCable, canopy.KindStrut, canopy.KindCable}, s.Kind)
	require.Equal(t, []canopy.Law{canopy.LawForceDensity, canopy.LawForceDensity, canopy.LawForce, canopy.LawElastic}, s.Law)
	require.Equal(t, []float64{3000, 3000, -5000, 0}, s.Given)
	require.Equal(t, []float64{0, 12e6, 0, 8e6}, s.Stiffness)
	require.Equal(t, []float64{0, 0, 0, 2.2}, s.Unstressed)
	require.Equal(t, []float64{9.80665, 0, 0, 0}, s.Weight)
	require.Nil(t, s.Strength)
	require.Equal(t, []string{"g1", "g2"}, s.Groups)
	require.Equal(t, []int32{0, 0, 1, -1}, s.Group)
	require.Equal(t, "second", s.MemberName.At(1))
	require.Equal(t, "2", s.MemberName.At(2))
	require.Equal(t, []canopy.Cable{{Name: "K", Kind: canopy.KindEdgeCable, Members: []int32{0, 1}, Nodes: []int32{0, 2, 1}}}, s.Cables)
	require.Equal(t, []int32{0, 0, -1, -1}, s.CableOf)
	require.Equal(t, [][3]int32{{0, 1, 2}, {1, 2, 0}}, s.Corners)
	require.Equal(t, []r3.Vec{{X: 1}, {Y: 1}}, s.Warp)
	require.Equal(t, [][2]float64{{2000, 2000}, {3000, 4000}}, s.Stress)
	require.Equal(t, []canopy.Fabric{{Name: "main", WarpStrength: 80e3, WeftStrength: 70e3, Weight: 10}}, s.Fabrics)
	require.True(t, s.SelfWeight)
}

// Rows in the file, CSV text in the file and a CSV file say the same.
func TestThreeWaysToWriteATable(t *testing.T) {
	dir := t.TempDir()
	require.NoError(t, os.WriteFile(filepath.Join(dir, "nodes.csv"), []byte("\xef\xbb\xbfx,y,z\n0,0,0\n1,0,0\n2,0.5,0"), 0o644))
	var first *canopy.Structure
	for _, nodes := range []string{"nodes.csv", "[{x: 0, y: 0, z: 0}, {x: 1000 mm, y: 0, z: 0}, {x: 2, y: 50 cm, z: 0}]", "|\n    x, y, z\n    0, 0, 0\n    1, 0, 0\n    2, 0.5, 0"} {
		text := "anticlast: 1\nlisted:\n  nodes: " + nodes + "\n  supports: [{node: 0}, {node: 2}]\n  members: [{from: 0, to: 1, force: 3}, {from: 1, to: 2, force: 3}]\n"
		m, err := spec.Read(context.Background(), spec.Input(strings.NewReader(text), dir), spec.Options{})
		require.NoError(t, err)
		if first == nil {
			first = m.Listed
		}
		require.Equal(t, first, m.Listed)
	}
}

// Names that are numbers, in whatever order, and names that are words find the
// same nodes.
func TestRenamingNodesChangesNothing(t *testing.T) {
	var first *canopy.Structure
	for _, name := range []func(i int) string{
		func(i int) string { return fmt.Sprint(i) },
		func(i int) string { return fmt.Sprint(i + 1) },
		func(i int) string { return fmt.Sprint(700 - 7*i) },
		func(i int) string { return fmt.Sprint(900000000 - i) },
		func(i int) string { return fmt.Sprintf("N.%d", i) },
		func(i int) string { return fmt.Sprintf("0%d", i) },
	} {
		var b strings.Builder
		b.WriteString("anticlast: 1\nlisted:\n  nodes: |\n    name, x, y, z\n")
		for i := range 50 {
			fmt.Fprintf(&b, "    %s, %d, 0, 0\n", name(i), i)
		}
		fmt.Fprintf(&b, "  supports: [{node: %s}]\n  members: |\n    from, to, force\n", name(0))
		for i := range 49 {
			fmt.Fprintf(&b, "    %s, %s, 1\n", name(i), name(i+1))
		}
		s := *read(t, b.String()).Listed
		if first != nil {
			for i := range 50 {
				require.Equal(t, name(i), s.NodeName.At(i))
			}
			s.NodeName = canopy.Names{}
			require.Equal(t, *first, s)
		} else {
			first = &s
		}
	}
}

// Inputs made to keep the reader busy are read in about linear time.
func TestHostileSizes(t *testing.T) {
	const n = 4000
	for name, write := range map[string]func(b *strings.Builder){
		"undefined points": func(b *strings.Builder) {
			b.WriteString("points:\n")
			for i := range n {
				fmt.Fprintf(b, "  a-rather-long-name-of-a-point-%d: [%d, 0, 0]\n", i, i)
			}
			b.WriteString("edges:\n")
			for i := range n {
				fmt.Fprintf(b, "  e%d: {from: a-rather-long-nome-of-a-point-%d, to: b%d, seam: true}\n", i, i, i)
			}
		},
		"parts without support": func(b *strings.Builder) {
			b.WriteString("points:\n")
			for i := range n {
				fmt.Fprintf(b, "  p%d: {x: %d, y: 0, z: 0, hold: free}\n  q%d: {x: %d, y: 1, z: 0, hold: free}\n", i, i, i, i)
			}
			b.WriteString("edges:\n")
			for i := range n {
				fmt.Fprintf(b, "  e%d: {from: p%d, to: q%d, cable: {force: 1}}\n", i, i, i)
			}
		},
		"stays": func(b *strings.Builder) {
			b.WriteString("points:\n  a: [0, 0, 0]\n  b: [1, 0, 0]\nguys:\n")
			for i := range n {
				fmt.Fprintf(b, "  g%d: {from: a, to: b, force: -1}\n", i)
			}
		},
		"long boundary": func(b *strings.Builder) {
			b.WriteString("points:\n")
			for i := range n {
				s, c := math.Sincos(2 * math.Pi * float64(i) / n)
				fmt.Fprintf(b, "  p%d: [%.9f, %.9f, 0]\n", i, 100*c, 100*s)
			}
			b.WriteString("edges:\n")
			for i := range n {
				fmt.Fprintf(b, "  e%d: {from: p%d, to: p%d, fixed: straight}\n", i, i, (i+1)%n)
			}
			b.WriteString("fabrics: {f: {prestress: -1, boundary: [e0")
			for i := 1; i < n; i++ {
				fmt.Fprintf(b, ", e%d", i)
			}
			b.WriteString("]}}\n")
		},
	} {
		t.Run(name, func(t *testing.T) {
			var b strings.Builder
			b.WriteString("anticlast: 1\n")
			write(&b)
			readErr(t, b.String(), spec.Options{})
		})
	}
}
