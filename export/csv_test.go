package export

import (
	"bytes"
	"encoding/csv"
	"math"
	"strconv"
	"strings"
	"testing"

	"anticlast/formfind/canopy"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/spatial/r3"
	"pgregory.net/rapid"
)

// sheet reads a table back with the standard library's reader.
func sheet(t *testing.T, name string, r *canopy.Result) (header []string, rows []map[string]string) {
	t.Helper()
	f, err := Lookup(name)
	require.NoError(t, err)
	var b bytes.Buffer
	require.NoError(t, f.Write(background, &b, r, Options{}))
	require.True(t, strings.HasPrefix(b.String(), "# "+canopy.Caution+"\r\n"))
	cr := csv.NewReader(&b)
	cr.Comment = '#'
	all, err := cr.ReadAll()
	require.NoError(t, err)
	for _, row := range all[1:] {
		m := map[string]string{}
		for i, h := range all[0] {
			m[h] = row[i]
		}
		rows = append(rows, m)
	}
	return all[0], rows
}

func num(t *testing.T, s string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(s, 64)
	require.NoError(t, err)
	return v
}

func TestNodesTable(t *testing.T) {
	r := sail(6)
	_, rows := sheet(t, "nodes", r)
	require.Len(t, rows, len(r.Form.Position))
	for i, row := range rows {
		require.InDelta(t, r.Form.Position[i].X, num(t, row["x [m]"]), 1e-8)
		require.InDelta(t, r.Form.Position[i].Z, num(t, row["z [m]"]), 1e-8)
	}
	require.Equal(t, "A", rows[0]["name"])
	require.Equal(t, "xyz", rows[0]["supported"])
	require.Equal(t, "", rows[1]["supported"])
	require.Equal(t, "xyz", rows[48]["held"])
}

func TestMembersTable(t *testing.T) {
	r := sail(6)
	_, rows := sheet(t, "members", r)
	require.Len(t, rows, len(r.Structure.Ends))
	total := 0.0
	for i, row := range rows {
		require.InEpsilon(t, r.Form.Force[i], 1000*num(t, row["force [kN]"]), 1e-9)
		total += num(t, row["length [m]"])
		// The unstressed length and the stiffness give the force back.
		ea, l0, l := num(t, row["stiffness EA [kN]"]), num(t, row["unstressed length [m]"]), num(t, row["length [m]"])
		require.InEpsilon(t, num(t, row["force [kN]"]), ea*(l-l0)/l0, 1e-5)
		require.InEpsilon(t, 1.35*math.Abs(r.Form.Force[i])*1.65/2e5, num(t, row["utilisation (prestress only) [-]"]), 1e-9)
	}
	require.InEpsilon(t, r.Summary.KindLength[canopy.KindEdgeCable]+r.Summary.KindLength[canopy.KindGuy]+r.Summary.KindLength[canopy.KindMast], total, 1e-9)
	require.Equal(t, "25", rows[0]["given force [kN]"])
	require.Equal(t, "AB", rows[0]["cable"])
	require.Equal(t, "mast", rows[24]["kind"])
	_, rows = sheet(t, "members", grid(4))
	require.Equal(t, "4", rows[0]["given force density [kN/m]"])
	require.Equal(t, "", rows[0]["given force [kN]"])
	require.Equal(t, "along", rows[0]["group"])
}

func TestTrianglesTable(t *testing.T) {
	r := sail(6)
	_, rows := sheet(t, "triangles", r)
	require.Len(t, rows, len(r.Structure.Corners))
	area := 0.0
	for i, row := range rows {
		area += num(t, row["area [m2]"])
		require.InEpsilon(t, r.Form.Stress[i].Warp/2500, num(t, row["warp achieved/specified [-]"]), 1e-9)
		major, minor := num(t, row["major principal [kN/m]"]), num(t, row["minor principal [kN/m]"])
		// The invariants of the stress tensor.
		require.InEpsilon(t, (r.Form.Stress[i].Warp+r.Form.Stress[i].Weft)/1000, major+minor, 1e-8)
		require.GreaterOrEqual(t, major, minor)
	}
	require.InEpsilon(t, r.Summary.FabricArea[0], area, 1e-8)
	// A vertical sheet slopes by 90°, a plane x = z by 45°.
	require.InDelta(t, 90, degrees(slope(r3.Vec{X: 1})), 1e-12)
	require.InDelta(t, 45, degrees(slope(r3.Unit(r3.Vec{X: 1, Z: -1}))), 1e-12)
}

// The action on the foundation is the opposite of the reaction.
func TestReactionsTable(t *testing.T) {
	r := sail(6)
	_, rows := sheet(t, "reactions", r)
	require.Len(t, rows, 6)
	for _, row := range rows {
		sum := 0.0
		for _, d := range []string{"x", "y", "z"} {
			v := num(t, row["reaction "+d+" [kN]"])
			require.Equal(t, -v, num(t, row["action on foundation "+d+" [kN]"])+0)
			sum += v * v
		}
		require.InEpsilon(t, math.Sqrt(sum), num(t, row["reaction [kN]"]), 1e-8)
	}
	_, rows = sheet(t, "reactions", cone(8))
	require.Equal(t, "base", rows[0]["line"])
}

func TestHeadersSayUnits(t *testing.T) {
	for _, name := range []string{"nodes", "members", "triangles", "reactions"} {
		header, _ := sheet(t, name, sail(3))
		for _, h := range header {
			for _, quantity := range []string{"length", "force", "stress", "area", "load", "reaction", "slope", "specified", "principal"} {
				if strings.Contains(h, quantity) {
					require.Regexp(t, ` \[(m|m2|kN|kN/m|deg|-)\]$`, h)
				}
			}
		}
	}
}

func TestNamesWithCommasAndQuotes(t *testing.T) {
	r := grid(3)
	r.Structure.NodeName.Append(`a "b", c`)
	r.Structure.NodeName.Append("#1")
	r.Structure.NodeName.Append("line\nbreak")
	_, rows := sheet(t, "nodes", r)
	require.Equal(t, `a "b", c`, rows[0]["name"])
	require.Equal(t, "#1", rows[1]["name"])
	require.Equal(t, "line\nbreak", rows[2]["name"])
	require.Equal(t, "3", rows[3]["name"])
}

func TestAppendNumber(t *testing.T) {
	for _, c := range []struct {
		v    float64
		want string
	}{{0, "0"}, {math.Copysign(0, -1), "0"}, {1, "1"}, {-1.5, "-1.5"}, {100, "100"}, {1e6, "1000000"}, {123456.789, "123456.789"},
		{0.1 + 0.2, "0.3"}, {99999999999.9, "100000000000"}, {12345.678901234, "12345.6789"}, {1e-7, "1e-07"}, {9.99999999999, "10"}, {2.0 / 3, "0.6666666667"}} {
		require.Equal(t, c.want, string(appendNumber(nil, c.v, 10)))
	}
}

// Read back, a number is the one that was written to the last digit kept.
func TestAppendNumberReadsBack(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := rapid.Float64Range(-1e300, 1e300).Draw(t, "v") // larger ones round up to infinity
		digits := rapid.IntRange(1, 17).Draw(t, "digits")
		s := string(appendNumber(nil, v, digits))
		got, err := strconv.ParseFloat(s, 64)
		require.NoError(t, err, s)
		want, err := strconv.ParseFloat(strconv.FormatFloat(v, 'e', digits-1, 64), 64)
		require.NoError(t, err)
		require.Equal(t, want, got, s)
	})
}

func BenchmarkTables(b *testing.B) {
	r := sail(sweepN(100, 300, 700))
	for _, name := range []string{"nodes", "members", "triangles", "reactions"} {
		f, _ := Lookup(name)
		b.Run(name, func(b *testing.B) {
			for b.Loop() {
				var n counter
				if err := f.Write(background, &n, r, Options{}); err != nil {
					b.Fatal(err)
				}
				b.SetBytes(int64(n))
			}
		})
	}
}

type counter int

func (c *counter) Write(p []byte) (int, error) {
	*c += counter(len(p))
	return len(p), nil
}
