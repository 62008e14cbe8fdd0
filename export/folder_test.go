package export

import (
	"bytes"
	"context"
	"errors"
	"io"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"anticlast/formfind/canopy"

	"github.com/stretchr/testify/require"
)

var background = context.Background()

func files(t *testing.T, dir string) []string {
	t.Helper()
	entries, err := os.ReadDir(dir)
	require.NoError(t, err)
	var names []string
	for _, e := range entries {
		names = append(names, e.Name())
	}
	return names
}

func TestFolderHoldsOneRunOnly(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "deep", "sail")
	require.NoError(t, Folder(background, dir, sail(3), []string{"json", "nodes", "summary", "form.json"}, Options{}))
	require.Equal(t, []string{marker, "form.json", "nodes.csv", "summary.txt"}, files(t, dir))
	require.NoError(t, Folder(background, dir, sail(3), []string{"members"}, Options{}))
	require.Equal(t, []string{marker, "members.csv"}, files(t, dir))
	require.Equal(t, []string{"sail"}, files(t, filepath.Dir(dir)), "nothing is left beside it")
}

func TestStandardFolderIsDeterministic(t *testing.T) {
	root := t.TempDir()
	for _, d := range []string{"a", "b"} {
		require.NoError(t, Folder(background, filepath.Join(root, d), sail(5), Standard(), Options{}))
	}
	for _, name := range files(t, filepath.Join(root, "a")) {
		a, err := os.ReadFile(filepath.Join(root, "a", name))
		require.NoError(t, err)
		b, err := os.ReadFile(filepath.Join(root, "b", name))
		require.NoError(t, err)
		require.True(t, bytes.Equal(a, b), name)
		require.NotContains(t, string(a), root, "no absolute paths")
	}
}

func TestForeignFolderIsRefused(t *testing.T) {
	root := t.TempDir()
	dir := filepath.Join(root, "holiday")
	require.NoError(t, os.Mkdir(dir, 0o755))
	require.NoError(t, os.WriteFile(filepath.Join(dir, "photo.jpg"), []byte("sea"), 0o644))
	err := Folder(background, dir, sail(3), []string{"json"}, Options{})
	require.ErrorIs(t, err, ErrForeign)
	require.ErrorContains(t, err, "photo.jpg")
	require.Equal(t, []string{"photo.jpg"}, files(t, dir))
	require.ErrorIs(t, Explanation(background, dir, "no", Options{}), ErrForeign)

	require.NoError(t, Folder(background, dir, sail(3), []string{"json"}, Options{Force: true}))
	require.Equal(t, []string{marker, "form.json"}, files(t, dir))
	require.Equal(t, []string{"photo.jpg"}, files(t, dir+".before-1"), "kept, not deleted")
	require.Equal(t, []string{"holiday", "holiday.before-1"}, files(t, root))
}

// A file that somebody put into a result folder is not lost either.
func TestForeignFileInResultFolderIsRefused(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "sail")
	require.NoError(t, Folder(background, dir, sail(3), []string{"json"}, Options{}))
	require.NoError(t, os.WriteFile(filepath.Join(dir, "notes.txt"), []byte("call the engineer"), 0o644))
	require.ErrorIs(t, Folder(background, dir, sail(3), []string{"json"}, Options{}), ErrForeign)
	require.NoError(t, os.Rename(filepath.Join(dir, "notes.txt"), filepath.Join(dir, ".DS_Store")))
	require.NoError(t, Folder(background, dir, sail(3), []string{"json"}, Options{}))
}

func TestEmptyFolderAndLinkAreTaken(t *testing.T) {
	root := t.TempDir()
	dir, link := filepath.Join(root, "real"), filepath.Join(root, "link")
	require.NoError(t, os.Mkdir(dir, 0o700))
	if os.Symlink("real", link) != nil {
		t.Skip("no symbolic links here")
	}
	require.NoError(t, Folder(background, link, sail(3), []string{"json"}, Options{}))
	require.Equal(t, []string{marker, "form.json"}, files(t, dir))
	info, err := os.Lstat(link)
	require.NoError(t, err)
	require.NotZero(t, info.Mode()&os.ModeSymlink, "the link is still one")
	info, err = os.Stat(dir)
	require.NoError(t, err)
	require.Equal(t, os.FileMode(0o700), info.Mode().Perm(), "permissions are kept")
}

func TestFailureLeavesYesterdaysFolder(t *testing.T) {
	root := t.TempDir()
	dir := filepath.Join(root, "sail")
	require.NoError(t, Folder(background, dir, sail(3), []string{"summary"}, Options{}))
	before, err := os.ReadFile(filepath.Join(dir, "summary.txt"))
	require.NoError(t, err)
	ctx, stop := context.WithCancel(background)
	stop()
	require.ErrorIs(t, Folder(ctx, dir, sail(4), []string{"nodes", "summary"}, Options{}), context.Canceled)
	require.ErrorIs(t, Explanation(ctx, dir, "no", Options{}), context.Canceled)
	broken := sail(3)
	broken.Form.Position = nil
	require.Error(t, Folder(background, dir, broken, []string{"json"}, Options{}))
	require.Error(t, Folder(background, dir, sail(3), []string{"nonsense"}, Options{}))
	after, err := os.ReadFile(filepath.Join(dir, "summary.txt"))
	require.NoError(t, err)
	require.Equal(t, before, after)
	require.Equal(t, []string{"sail"}, files(t, root), "no temporary folders are left")
}

func TestExplanationReplacesTheShape(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "sail")
	require.NoError(t, Folder(background, dir, sail(3), []string{"json", "summary"}, Options{}))
	require.NoError(t, Explanation(background, dir, "There is no equilibrium.", Options{}))
	require.Equal(t, []string{marker, "summary.txt"}, files(t, dir))
	b, err := os.ReadFile(filepath.Join(dir, "summary.txt"))
	require.NoError(t, err)
	require.Equal(t, "There is no equilibrium.\n\n"+canopy.Caution+"\n", string(b))
}

// A run killed between the two renames left the folder under its old name.
func TestKilledSwapIsUndone(t *testing.T) {
	root := t.TempDir()
	dir, old := filepath.Join(root, "sail"), filepath.Join(root, ".sail.old")
	require.NoError(t, Folder(background, dir, sail(3), []string{"summary"}, Options{}))
	require.NoError(t, os.Rename(dir, old))
	ctx, stop := context.WithCancel(background)
	stop()
	require.Error(t, Folder(ctx, dir, sail(3), []string{"nodes"}, Options{}))
	require.Equal(t, []string{marker, "summary.txt"}, files(t, dir), "back in its place")
	// Killed later: both are there, the old one is rubbish.
	require.NoError(t, Folder(background, old, sail(3), []string{"summary"}, Options{}))
	require.NoError(t, Folder(background, dir, sail(3), []string{"nodes"}, Options{}))
	require.Equal(t, []string{"sail"}, files(t, root))
}

func TestFileIsWrittenWholeOrNotAtAll(t *testing.T) {
	root := t.TempDir()
	name := filepath.Join(root, "out.csv")
	f, err := Lookup("nodes")
	require.NoError(t, err)
	require.NoError(t, File(background, name, sail(3), f, Options{}))
	info, err := os.Stat(name)
	require.NoError(t, err)
	require.Equal(t, os.FileMode(0o644), info.Mode().Perm())
	f.Write = func(context.Context, io.Writer, *canopy.Result, Options) error { return errors.New("no") }
	require.ErrorContains(t, File(background, name, sail(3), f, Options{}), "no")
	require.Equal(t, []string{"out.csv"}, files(t, root))
}

func TestLookup(t *testing.T) {
	for name, want := range map[string]string{"json": "json", "form.json": "json", ".JSON": "json", "nodes.csv": "nodes", "txt": "summary"} {
		f, err := Lookup(name)
		require.NoError(t, err, name)
		require.Equal(t, want, f.Name)
	}
	_, err := Lookup("memebrs")
	require.ErrorContains(t, err, `did you mean "members"`)
	_, err = Lookup("csv")
	require.ErrorContains(t, err, "say which of nodes, members")
	_, err = Lookup("hologram")
	require.ErrorContains(t, err, "there are json, ")
}

func TestTableOfFormats(t *testing.T) {
	var names, fileNames []string
	for _, f := range Formats() {
		require.NotContains(t, names, f.Name)
		require.NotContains(t, fileNames, f.File)
		require.Equal(t, f.Ext, filepath.Ext(f.File))
		require.NotEmpty(t, f.Purpose)
		require.NotNil(t, f.Write)
		require.Equal(t, strings.ToLower(f.Name), f.Name)
		names, fileNames = append(names, f.Name), append(fileNames, f.File)
	}
	for _, s := range Standard() {
		require.True(t, slices.Contains(names, s), s)
	}
}

// quick makes pictures small.
var quick = Options{PictureWidth: 200}

// Every writer passes on errors of its io.Writer and of its context.
func TestWritersReportErrors(t *testing.T) {
	for _, f := range Formats() {
		var all bytes.Buffer
		require.NoError(t, f.Write(background, &all, sail(6), quick), f.Name)
		disk := errors.New("disk full")
		for _, n := range []int{0, 1, all.Len() / 2, all.Len() - 1} {
			require.ErrorIs(t, f.Write(background, &failing{n, disk}, sail(6), quick), disk, f.Name)
		}
		ctx, stop := context.WithCancel(background)
		stop()
		require.ErrorIs(t, f.Write(ctx, io.Discard, sail(6), quick), context.Canceled, f.Name)
	}
}

type failing struct {
	left int
	err  error
}

func (f *failing) Write(p []byte) (int, error) {
	if f.left -= len(p); f.left < 0 {
		return 0, f.err
	}
	return len(p), nil
}

// Every output carries the caution, and every one is the same the second time.
func TestEveryFormatCarriesTheCautionAndRepeats(t *testing.T) {
	for _, f := range Formats() {
		for _, r := range []*canopy.Result{sail(4), cone(8), grid(4)} {
			var a, b bytes.Buffer
			if err := f.Write(background, &a, r, quick); errors.Is(err, ErrNoFabric) && len(r.Structure.Corners) == 0 {
				continue
			} else {
				require.NoError(t, err, f.Name)
			}
			require.NoError(t, f.Write(background, &b, r, quick), f.Name)
			require.True(t, bytes.Equal(a.Bytes(), b.Bytes()), f.Name)
			if f.Name != "handover" { // compressed
				text := strings.Join(strings.Fields(a.String()), " ")
				require.Contains(t, text, "reliminary design only", f.Name)
			}
		}
	}
}
