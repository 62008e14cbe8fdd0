package spec_test

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/require"

	"anticlast/formfind"
)

// A hall over a drawn outline with a rib across it: the faces share one air.
const hallTable = `layer,x,y,z
RIM,0,0,1
RIM,7,0,1
RIM,14,0,1
RIM,14,8,1
RIM,7,8,1
RIM,0,8,1
RIM,0,0,1

RIB,7,0,1
RIB,7,8,1
`

const hallOutline = `anticlast: 1
mesh: 1 m
outline:
  file: hall.csv
  units: m
  layers: {RIM: fixed, RIB: {cable: {force: 3 kN}}}
  fabric: {name: hall, prestress: 2 kN/m, volume: 180 m3}
`

func TestTheFacesOfAnOutlineShareTheirAir(t *testing.T) {
	m, warned, err := readBeside(hallOutline, map[string]string{"hall.csv": hallTable})
	require.NoError(t, err)
	require.Empty(t, warned)
	require.Len(t, m.Fabrics, 2)
	require.True(t, m.Fabrics[0].HasVolume)
	require.Equal(t, 180.0, m.Fabrics[0].Volume)
	require.Equal(t, []string{"hall:2"}, m.Fabrics[0].VolumeWith)
	require.False(t, m.Fabrics[1].HasVolume)
	r, err := formfind.Find(t.Context(), m, formfind.Options{})
	require.NoError(t, err)
	require.True(t, r.Audit.Trusted, "%v", r.Audit.Reasons)
	require.InEpsilon(t, 180, r.Summary.Enclosed[0], 1e-9)
	require.Positive(t, r.Form.Pressure[0])

	_, _, err = readBeside(strings.Replace(hallOutline, "volume: 180 m3", "volume: 180 m3, pressure: 300 Pa", 1), map[string]string{"hall.csv": hallTable})
	require.ErrorContains(t, err, "7:43")
	require.ErrorContains(t, err, "has a volume and a pressure")
}

// A mesh from another program may shut in air as well, whichever way its triangles
// are turned; a volume that cannot be had is refused, not left out.
func TestAMeshHasAir(t *testing.T) {
	const model = "anticlast: 1\noutline:\n  file: dome.obj\n  units: m\n  fabric: {prestress: 2 kN/m, volume: 0.5 m3}\n"
	const vertices = "v 0 0 0\nv 2 0 0\nv 2 2 0\nv 0 2 0\nv 0.7 0.7 0\nv 1.3 0.7 0\nv 1.3 1.3 0\nv 0.7 1.3 0\n"
	up := vertices + "f 1 2 6 5\nf 2 3 7 6\nf 3 4 8 7\nf 4 1 5 8\nf 5 6 7 8\n"
	down := vertices + "f 5 6 2 1\nf 6 7 3 2\nf 7 8 4 3\nf 8 5 1 4\nf 8 7 6 5\n"
	for _, mesh := range []string{up, down} {
		m, _, err := readBeside(model, map[string]string{"dome.obj": mesh})
		require.NoError(t, err)
		r, err := formfind.Find(t.Context(), m, formfind.Options{})
		require.NoError(t, err)
		require.InEpsilon(t, 0.5, r.Summary.Enclosed[0], 1e-9)
		require.Positive(t, r.Form.Pressure[0])
		require.Greater(t, r.Form.Position[4].Z, 0.1)
	}
	_, _, err := readBeside(model, map[string]string{"dome.obj": strings.Replace(up, "v 2 2 0", "v 2 2 0.4", 1)})
	require.ErrorContains(t, err, "5:31")
	require.ErrorContains(t, err, "does not lie in a plane")
	_, _, err = readBeside(strings.Replace(model, "volume:", "pressure: 300 Pa, volume:", 1), map[string]string{"dome.obj": up})
	require.ErrorContains(t, err, "has a volume and a pressure")
}
