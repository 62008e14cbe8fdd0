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
