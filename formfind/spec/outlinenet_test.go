package spec_test

import (
	"context"
	"os"
	"strings"
	"testing"

	"anticlast/formfind/mesh"

	"github.com/stretchr/testify/require"
)

const netYard = `anticlast: 1
outline:
  file: plan.csv
  units: m
  layers: {RIM: {cable: {mean force: 200 kN}}, TREE: hole}
  net:
    name: roof
    direction: [1, 1, 0]
    families: [{spacing: 1.2 m, mean force: 5 kN}, {spacing: 1 m, mean force: 5 kN}]
`

const netPlan = "layer,x,y,z\nRIM,0,0,4\nRIM,12,0,2\nRIM,12,9,4\nRIM,0,9,2\nRIM,0,0,4\n\nTREE,4,4,3\nTREE,6,4,3\nTREE,5,6,3\nTREE,4,4,3\n"

// Each face of a drawing is laid with lines of cable.
func TestNetsInOutlines(t *testing.T) {
	m, _, err := readBeside(strings.Replace(netYard, "TREE: hole", "TREE: hole, CUT: {cable: {force: 90 kN}}", 1), map[string]string{"plan.csv": netPlan + "\nCUT,12,0,2\nCUT,12,-5,4\nCUT,0,0,4\n"})
	require.NoError(t, err)
	require.Empty(t, m.Fabrics)
	require.Len(t, m.Nets, 2)
	var names []string
	holes := 0
	for _, n := range m.Nets {
		names = append(names, n.Name)
		holes += len(n.Holes)
		require.Len(t, n.Families, 2)
		require.InDelta(t, n.Direction.X, n.Direction.Y, 1e-12)
	}
	require.Equal(t, []string{"roof:1", "roof:2"}, names)
	require.Equal(t, 1, holes, "around the tree")
	s, err := mesh.Build(context.Background(), m)
	require.NoError(t, err)
	require.Greater(t, len(s.Ends), 250)
	require.Empty(t, s.Corners)
}

func TestFaultsOfNetsInOutlines(t *testing.T) {
	for name, c := range map[string]struct{ model, plan, want string }{
		"fabric too":   {netYard + "  fabric: {prestress: 2}\n", netPlan, "the faces of the outline have a fabric and a net"},
		"point inside": {strings.Replace(netYard, "TREE: hole", "TREE: hole, X: point", 1), netPlan + "\nX,9,2,3\n", "point X:1 lies inside net \"roof\""},
		"no families":  {strings.Replace(netYard, "    families:", "    family:", 1), netPlan, "families"},
		"boundary":     {netYard + "    boundary: [RIM:1]\n", netPlan, "boundary"},
		"name":         {strings.Replace(netYard, "name: roof", "name: 'ro of/'", 1), netPlan, "cannot be the name of a net"},
		"radial":       {strings.Replace(strings.Replace(netYard, "direction: [1, 1, 0]", "pattern: radial", 1), ", TREE: hole", "", 1), netPlan[:strings.Index(netPlan, "\nTREE")], "is radial and has 0 holes"},
	} {
		t.Run(name, func(t *testing.T) {
			_, _, err := readBeside(c.model, map[string]string{"plan.csv": c.plan})
			require.ErrorContains(t, err, c.want)
		})
	}
	saddle, err := os.ReadFile("../outline/testdata/saddle.obj")
	require.NoError(t, err)
	_, _, err = readBeside("anticlast: 1\noutline: {file: a.obj, units: mm, fabric: {prestress: 2}, net: {families: [{spacing: 1, force: 5}, {spacing: 1, force: 5}]}}\n", map[string]string{"a.obj": string(saddle)})
	require.ErrorContains(t, err, "a net goes into a drawing")
}
