package export

import (
	"runtime"
	"testing"

	"anticlast/formfind/canopy"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// heapWatcher counts bytes and, every so many of them, what lives on the heap.
type heapWatcher struct {
	every, next, bytes int64
	most               uint64
}

func (h *heapWatcher) Write(p []byte) (int, error) {
	h.bytes += int64(len(p))
	if h.bytes >= h.next {
		h.next = h.bytes + h.every
		h.most = max(h.most, live())
	}
	return len(p), nil
}

// live are the bytes of the heap that are in use.
func live() uint64 {
	runtime.GC()
	var m runtime.MemStats
	runtime.ReadMemStats(&m)
	return m.HeapAlloc
}

// extra is the most that lives on the heap, beyond what did before, while r is
// written, looked at some twenty times, and the bytes written.
func extra(t *testing.T, name string, r *canopy.Result) (heap, bytes int64) {
	t.Helper()
	f, err := Lookup(name)
	require.NoError(t, err)
	var n counter
	require.NoError(t, f.Write(background, &n, r, Options{}))
	w := &heapWatcher{every: int64(n)/20 + 1}
	w.next = w.every
	before := live()
	require.NoError(t, f.Write(background, w, r, Options{}))
	require.EqualValues(t, n, w.bytes)
	return int64(w.most) - int64(before), int64(n)
}

// What stays as numbers or text streams: beside buffers there is at most a mark
// or two for each node or member, whatever the size of the file. Only the
// colours at the nodes of PLY and the residuals of VTU need two or three numbers
// for each node.
func TestTextStreamsInConstantMemory(t *testing.T) {
	r := sail(sweepN(120, 300, 708)) // 708: a million triangles
	nodes := int64(len(r.Form.Position))
	for _, name := range []string{"json", "nodes", "members", "triangles", "reactions", "handover", "dxf", "ifc", "obj", "stl", "ply", "vtu"} {
		if name == "ifc" && nodes > 20000 {
			continue // two kilobytes a triangle are for small models
		}
		heap, bytes := extra(t, name, r)
		t.Logf("%-10s %10d bytes, %8d bytes of heap for %d triangles", name, bytes, heap, len(r.Structure.Corners))
		buffers := int64(256 << 10)
		if name == "json" {
			buffers = 8 << 20 // of parts that are put into text side by side
		}
		each := int64(1)
		switch name {
		case "ifc":
			each = 9
		case "ply":
			each = 18
		case "vtu":
			each = 25 // residuals gather at nodes
		}
		assert.Less(t, heap, buffers+each*nodes, name)
	}
}

// The numbers of a GLB are not gathered before they are written: what lives
// beside the form are its sheets as meshes, not the file with its six layers of
// colour, which has about as many bytes again.
func TestGLBIsWrittenInTwoPasses(t *testing.T) {
	r := sail(sweepN(120, 300, 708))
	heap, bytes := extra(t, "glb", r)
	triangles := len(r.Structure.Corners)
	t.Logf("%d bytes, %d bytes of heap for %d triangles", bytes, heap, triangles)
	require.Less(t, heap, int64(1<<20+60*triangles))
}
