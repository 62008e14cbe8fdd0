package house

import (
	"go/parser"
	"go/token"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"
)

const module = "anticlast"

// may is the table of who may import what of ours, kept in step with the map
// in DEVELOPERS.md. A trailing /… stands for everything below. Imports of tests
// are free.
var may = map[string][]string{
	"formfind/canopy":          {},
	"formfind/engine":          {"formfind/canopy"},
	"formfind/element":         {},
	"formfind/surface":         {"formfind/canopy"},
	"formfind/outline":         {"formfind/canopy"},
	"formfind/spec":            {"formfind/canopy", "formfind/outline"},
	"formfind/formfile":        {"formfind/canopy"},
	"formfind/mesh":            {"formfind/canopy"},
	"formfind/load":            {"formfind/canopy", "formfind/surface"},
	"formfind/relax":           {"formfind/canopy", "formfind/engine", "formfind/element", "formfind/internal/crew"},
	"formfind/newton":          {"formfind/canopy", "formfind/engine", "formfind/element", "formfind/internal/crew", "formfind/internal/mixing", "fdm/sparse"},
	"formfind/audit":           {"formfind/canopy", "formfind/surface", "fdm/sparse"},
	"formfind/limit":           {"formfind/canopy", "formfind/surface"},
	"formfind/internal/cases":  {"formfind/canopy"},
	"formfind/internal/crew":   {},
	"formfind/internal/mixing": {},
	"formfind/internal/sweep":  {},
	"formfind/internal/house":  {},
	"formfind":                 {"formfind/…", "fdm"},
	"fdm":                      {"fdm/sparse"},
	"fdm/sparse":               {"fdm/sparse/…"},
	"export":                   {"formfind/…", "export/…"},
	"cmd/anticlast":            {"…"},
	"examples":                 {},
}

func root(t *testing.T) string {
	t.Helper()
	dir, err := filepath.Abs(".")
	require.NoError(t, err)
	for {
		if _, err := os.Stat(filepath.Join(dir, "go.mod")); err == nil {
			return dir
		}
		up := filepath.Dir(dir)
		require.NotEqual(t, up, dir, "no go.mod above the test")
		dir = up
	}
}

func allowed(list []string, what string) bool {
	return slices.ContainsFunc(list, func(a string) bool {
		if base, all := strings.CutSuffix(a, "…"); all {
			return strings.HasPrefix(what+"/", base)
		}
		return a == what
	})
}

// ruleOf returns what pkg may import: its own row or that of the folder above.
func ruleOf(pkg string) ([]string, bool) {
	for p := pkg; p != "."; p = filepath.Dir(p) {
		if r, ok := may[p]; ok {
			return append(slices.Clone(r), p+"/…", p), true
		}
	}
	return nil, false
}

func TestImportsFollowTheTable(t *testing.T) {
	top := root(t)
	seen := 0
	err := filepath.WalkDir(top, func(path string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		name := d.Name()
		if d.IsDir() && (strings.HasPrefix(name, ".") || name == "testdata" || name == "node_modules") && path != top {
			return fs.SkipDir
		}
		if d.IsDir() || !strings.HasSuffix(name, ".go") || strings.HasSuffix(name, "_test.go") {
			return nil
		}
		rel, err := filepath.Rel(top, filepath.Dir(path))
		require.NoError(t, err)
		pkg := filepath.ToSlash(rel)
		rule, ok := ruleOf(pkg)
		require.True(t, ok, "package %s is not in the table; add a row, and a line in DEVELOPERS.md", pkg)
		f, err := parser.ParseFile(token.NewFileSet(), path, nil, parser.ImportsOnly)
		require.NoError(t, err)
		for _, i := range f.Imports {
			p, err := strconv.Unquote(i.Path.Value)
			require.NoError(t, err)
			if ours, is := strings.CutPrefix(p, module+"/"); is && !allowed(rule, ours) {
				t.Errorf("%s imports %s, which the table does not allow", pkg+"/"+name, ours)
			}
			if p == "C" {
				t.Errorf("%s uses cgo", pkg+"/"+name)
			}
			seen++
		}
		return nil
	})
	require.NoError(t, err)
	require.Greater(t, seen, 50)
}

func TestTopLevelHoldsExactlyWhatWasAgreed(t *testing.T) {
	want := []string{"DEVELOPERS.md", "README.md", "SAFETY.md", "cmd", "examples", "export", "fdm", "formfind", "go.mod", "go.sum", "testdata"}
	entries, err := os.ReadDir(root(t))
	require.NoError(t, err)
	var got []string
	for _, e := range entries {
		if !strings.HasPrefix(e.Name(), ".") && e.Name() != module { // a built binary is ignored
			got = append(got, e.Name())
		}
	}
	require.Equal(t, want, got)
}
