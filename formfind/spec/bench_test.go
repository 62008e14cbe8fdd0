package spec_test

import (
	"bufio"
	"context"
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"anticlast/formfind/spec"

	"github.com/stretchr/testify/require"
)

func BenchmarkReadSample(b *testing.B) {
	for _, s := range spec.Samples() {
		b.Run(s.Name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				_, err := spec.Read(context.Background(), spec.Input(strings.NewReader(s.Text), "."), spec.Options{})
				require.NoError(b, err)
			}
		})
	}
}

// grid writes a listed net of n × n nodes into a folder and returns the model
// file.
func grid(t testing.TB, n int, named bool) string {
	t.Helper()
	dir := t.TempDir()
	write := func(name string, fill func(w *bufio.Writer)) {
		f, err := os.Create(filepath.Join(dir, name))
		require.NoError(t, err)
		w := bufio.NewWriterSize(f, 1<<20)
		fill(w)
		require.NoError(t, w.Flush())
		require.NoError(t, f.Close())
	}
	r := rand.New(rand.NewPCG(1, 2))
	id := func(i, j int) string {
		if named {
			return fmt.Sprintf("n%d_%d", i, j)
		}
		return fmt.Sprint(i*n + j)
	}
	write("nodes.csv", func(w *bufio.Writer) {
		w.WriteString("name,x,y,z\n")
		for i := range n {
			for j := range n {
				fmt.Fprintf(w, "%s,%d,%d,%.17g\n", id(i, j), i, j, 3+r.Float64())
			}
		}
	})
	write("supports.csv", func(w *bufio.Writer) {
		w.WriteString("node\n")
		for i := range n {
			fmt.Fprintf(w, "%s\n%s\n", id(i, 0), id(i, n-1))
		}
	})
	write("members.csv", func(w *bufio.Writer) {
		w.WriteString("from,to,kind,force density [kN/m]\n")
		for i := range n {
			for j := range n {
				if i+1 < n {
					fmt.Fprintf(w, "%s,%s,net cable,%.3f\n", id(i, j), id(i+1, j), 1+r.Float64())
				}
				if j+1 < n {
					fmt.Fprintf(w, "%s,%s,net cable,%.3f\n", id(i, j), id(i, j+1), 1+r.Float64())
				}
			}
		}
	})
	path := filepath.Join(dir, "net.yaml")
	require.NoError(t, os.WriteFile(path, []byte("anticlast: 1\nlisted: {nodes: nodes.csv, supports: supports.csv, members: members.csv}\n"), 0o644))
	return path
}

func BenchmarkReadListedMillion(b *testing.B) {
	for _, named := range []bool{false, true} {
		b.Run(map[bool]string{false: "numbers", true: "names"}[named], func(b *testing.B) {
			const n = 1000
			path := grid(b, n, named)
			b.ReportAllocs()
			rows := 0
			b.ResetTimer()
			for b.Loop() {
				m, err := spec.Read(context.Background(), spec.File(path), spec.Options{})
				require.NoError(b, err)
				rows = len(m.Listed.Position) + len(m.Listed.Ends) + 2*n
			}
			b.ReportMetric(float64(rows)*float64(b.N)/b.Elapsed().Seconds()/1e6, "Mrows/s")
		})
	}
}

func BenchmarkParseQuantity(b *testing.B) {
	for b.Loop() {
		_, err := spec.ParseQuantity("2.5 kN/m", spec.ForcePerLength)
		require.NoError(b, err)
	}
}
