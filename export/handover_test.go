package export

import (
	"archive/zip"
	"bytes"
	"encoding/json"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"anticlast/formfind"
	"anticlast/formfind/canopy"
	"anticlast/formfind/spec"

	"github.com/stretchr/testify/require"
)

// found forms one of the example models.
func found(t *testing.T, name string) *canopy.Result {
	t.Helper()
	m, err := spec.Read(background, spec.File(filepath.Join("..", "examples", name+".yaml")), spec.Options{})
	require.NoError(t, err)
	r, err := formfind.Find(background, m, formfind.Options{})
	require.NoError(t, err)
	return r
}

// From the folder alone an independent program finds the same residual, the
// same reactions, and nodes that do not move.
func TestHandoverIsEnoughToRebuildTheEquilibrium(t *testing.T) {
	t.Parallel()
	py := python(t, "numpy", "scipy.sparse")
	for _, name := range []string{"four-point-sail", "cone", "cable-net"} {
		dir := filepath.Join(t.TempDir(), "handover")
		require.NoError(t, Handover(background, dir, found(t, name), Options{}))
		var got struct {
			Residual, Reactions, Moved float64
			Nodes, Free                int
		}
		require.NoError(t, json.Unmarshal([]byte(run(t, py, "testdata/rebuild.py", dir)), &got))
		require.Less(t, got.Residual, 1e-9, name)
		require.Less(t, got.Reactions, 1e-9, name)
		require.Less(t, got.Moved, 1e-9, name)
		require.Positive(t, got.Free)
	}
}

// The archive holds what the folder holds.
func TestHandoverArchive(t *testing.T) {
	r := cone(12)
	dir := filepath.Join(t.TempDir(), "handover")
	require.NoError(t, Handover(background, dir, r, Options{}))
	var b bytes.Buffer
	require.NoError(t, writeHandover(background, &b, r, Options{}))
	z, err := zip.NewReader(bytes.NewReader(b.Bytes()), int64(b.Len()))
	require.NoError(t, err)
	require.Len(t, z.File, len(handoverFiles)+1)
	for _, f := range z.File {
		in, err := f.Open()
		require.NoError(t, err)
		inside, err := io.ReadAll(in)
		require.NoError(t, err)
		outside, err := os.ReadFile(filepath.Join(dir, strings.TrimPrefix(f.Name, "handover/")))
		require.NoError(t, err)
		require.Equal(t, string(outside), string(inside))
		require.Contains(t, string(inside), canopy.Caution)
	}
}

func TestHandoverTextTellsEveryFile(t *testing.T) {
	s := handoverText(sail(3))
	for _, f := range handoverFiles {
		require.Contains(t, s, f.name)
	}
	require.Contains(t, s, "tension is positive"[1:])
}
