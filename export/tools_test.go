package export

import (
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"testing"

	"anticlast/formfind/canopy"

	"github.com/stretchr/testify/require"
)

// Independent programs read what this package writes. A stranger may not have
// them: such tests are then skipped, unless ANTICLAST_REQUIRE_TOOLS=1, as in
// continuous integration, says that they must be there.

// absent skips or fails.
func absent(t *testing.T, what string) {
	t.Helper()
	if os.Getenv("ANTICLAST_REQUIRE_TOOLS") == "1" {
		t.Fatalf("%s is missing", what)
	}
	t.Skipf("%s is missing", what)
}

// tool returns the path of a program.
func tool(t *testing.T, name string) string {
	t.Helper()
	path, err := exec.LookPath(name)
	if err != nil {
		absent(t, name)
	}
	return path
}

// python returns a Python that has the modules. The system's own is tried
// first, for distributions install such modules there.
func python(t *testing.T, modules ...string) string {
	t.Helper()
	list := strings.Join(modules, ", ")
	pythonsLock.Lock()
	defer pythonsLock.Unlock()
	if path, ok := pythons[list]; ok {
		return path
	}
	for _, path := range []string{"/usr/bin/python3", "python3"} {
		if exec.Command(path, "-c", "import "+list).Run() == nil {
			pythons[list] = path
			return path
		}
	}
	absent(t, "Python with "+list)
	return ""
}

// pythons remembers what python found.
var (
	pythons     = map[string]string{}
	pythonsLock sync.Mutex
)

// saved writes r in a format to a file.
func saved(t *testing.T, name string, r *canopy.Result) string {
	t.Helper()
	f, err := Lookup(name)
	require.NoError(t, err)
	path := filepath.Join(t.TempDir(), f.File)
	require.NoError(t, File(background, path, r, f, Options{}))
	return path
}

// run runs a program and returns what it prints.
func run(t *testing.T, name string, args ...string) string {
	t.Helper()
	out, err := exec.Command(name, args...).CombinedOutput()
	require.NoError(t, err, string(out))
	return string(out)
}
