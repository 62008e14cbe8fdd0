package main

import (
	"bytes"
	"context"
	"encoding/json"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"

	"anticlast/formfind/spec"
)

// small is the starter sail on a coarse mesh, for tests that only need some
// canopy.
const small = `anticlast: 1
title: Trial
mesh: 1 m
points:
  A: [0, 0, 4]
  B: [8, 0, 2]
  C: [8, 8, 4]
  D: [0, 8, 2]
edges:
  AB: {from: A, to: B, cable: {force: 22 kN}}
  BC: {from: B, to: C, cable: {sag: 10 %}}
  CD: {from: C, to: D, cable: {force: 22 kN}}
  DA: {from: D, to: A, cable: {force: 22 kN}}
fabrics:
  sail: {boundary: [AB, BC, CD, DA], prestress: {warp: 2.5 kN/m, weft: 2.5 kN/m}, warp: [1, 1, 0]}
`

type ran struct {
	code     int
	out, err string
}

func run(t *testing.T, in string, args ...string) ran {
	t.Helper()
	var out, errs bytes.Buffer
	code := Run(t.Context(), args, Streams{In: strings.NewReader(in), Out: &out, Err: &errs})
	return ran{code, out.String(), errs.String()}
}

func write(t *testing.T, dir, name, text string) string {
	t.Helper()
	p := filepath.Join(dir, name)
	require.NoError(t, os.WriteFile(p, []byte(text), 0o644))
	return p
}

func folder(t *testing.T, dir string) map[string]string {
	t.Helper()
	files := map[string]string{}
	entries, err := os.ReadDir(dir)
	require.NoError(t, err)
	for _, e := range entries {
		b, err := os.ReadFile(filepath.Join(dir, e.Name()))
		require.NoError(t, err)
		files[e.Name()] = string(b)
	}
	return files
}

func TestFormWritesTheWholeFolderBesideTheModel(t *testing.T) {
	dir := t.TempDir()
	m := write(t, dir, "sail.yaml", small)
	r := run(t, "", "form", m)
	require.Equal(t, exitFine, r.code, r.err)
	require.Contains(t, r.out, "the audit trusts it")
	require.Contains(t, r.out, "preliminary design")
	files := folder(t, filepath.Join(dir, "sail-form"))
	for _, name := range []string{"form.json", "form.glb", "nodes.csv", "members.csv", "triangles.csv", "reactions.csv", "summary.txt"} {
		require.NotEmpty(t, files[name], name)
		if name != "form.glb" {
			require.Contains(t, files[name], "preliminary design", name)
		}
	}
	require.Contains(t, files["form.glb"], "preliminary design")
	require.Equal(t, exitFine, run(t, "", "check", filepath.Join(dir, "sail-form", "form.json")).code)
	require.Equal(t, exitFine, run(t, "", "check", filepath.Join(dir, "sail-form")).code, "a folder stands for its form.json")
	entries, err := os.ReadDir(dir)
	require.NoError(t, err)
	require.Len(t, entries, 2, "nothing is left beside the model and the folder")
}

func TestSameInputSameBytesWhateverGOMAXPROCS(t *testing.T) {
	dir := t.TempDir()
	m := write(t, dir, "sail.yaml", small)
	require.Equal(t, exitFine, run(t, "", "form", m, "-o", filepath.Join(dir, "one")).code)
	before := runtime.GOMAXPROCS(1)
	r := run(t, "", "form", m, "-o", filepath.Join(dir, "two"))
	runtime.GOMAXPROCS(max(before, 2))
	require.Equal(t, exitFine, r.code)
	require.Equal(t, exitFine, run(t, "", "form", m, "-o", filepath.Join(dir, "three")).code)
	runtime.GOMAXPROCS(before)
	one := folder(t, filepath.Join(dir, "one"))
	require.Equal(t, one, folder(t, filepath.Join(dir, "two")))
	require.Equal(t, one, folder(t, filepath.Join(dir, "three")))
}

func TestSetChangesOneValue(t *testing.T) {
	dir := t.TempDir()
	m := write(t, dir, "sail.yaml", small)
	head := func(args ...string) (h struct {
		Audit struct{ Trusted bool }
	}) {
		r := run(t, "", append([]string{"form", m, "--json"}, args...)...)
		require.Equal(t, exitFine, r.code, r.err)
		require.NoError(t, json.Unmarshal([]byte(r.out), &h), r.out)
		return h
	}
	require.True(t, head().Audit.Trusted)
	before := folder(t, filepath.Join(dir, "sail-form"))["nodes.csv"]
	head("--set", "points.A.z=6.5")
	after := folder(t, filepath.Join(dir, "sail-form"))["nodes.csv"]
	require.NotEqual(t, before, after)
	require.Contains(t, after, "6.5")

	r := run(t, "", "form", m, "--set", "points.M1.z=6.5")
	require.Equal(t, exitBadInput, r.code)
	require.Contains(t, r.err, "M1")
}

func TestPipesWithoutFiles(t *testing.T) {
	r := run(t, small, "form", "-")
	require.Equal(t, exitFine, r.code, r.err)
	require.True(t, json.Valid([]byte(r.out)))
	c := run(t, r.out, "check", "-", "--json")
	require.Equal(t, exitFine, c.code, c.err)
	require.True(t, json.Valid([]byte(c.out)))
	c = run(t, small, "check", "-")
	require.Equal(t, exitFine, c.code, c.err)
	require.Contains(t, c.out, "trusts")
	e := run(t, r.out, "export", "-", "--to", "reactions")
	require.Equal(t, exitFine, e.code, e.err)
	require.True(t, strings.HasPrefix(e.out, "#"), "the caution comes first")
}

func TestExportGivesWhatFormWrote(t *testing.T) {
	dir := t.TempDir()
	m := write(t, dir, "sail.yaml", small)
	require.Equal(t, exitFine, run(t, "", "form", m).code)
	wrote := folder(t, filepath.Join(dir, "sail-form"))
	for name, ext := range map[string]string{"nodes": "nodes.csv", "members": "members.csv", "triangles": "triangles.csv", "reactions": "reactions.csv", "glb": "form.glb", "json": "form.json"} {
		e := run(t, "", "export", filepath.Join(dir, "sail-form"), "--to", name, "-o", "-")
		require.Equal(t, exitFine, e.code, e.err)
		require.Equal(t, wrote[ext], e.out, "%s from form.json is the same to the byte", name)
	}
}

func TestHandoverIsAFolderOrAnArchive(t *testing.T) {
	dir := t.TempDir()
	form := filepath.Join(dir, "sail-form")
	require.Equal(t, exitFine, run(t, "", "form", write(t, dir, "sail.yaml", small)).code)
	before := folder(t, form)
	tables := filepath.Join(dir, "engineer")
	for range 2 { // the second takes the place of the first
		e := run(t, "", "export", form, "--to", "handover", "-o", tables)
		require.Equal(t, exitFine, e.code, e.err)
		got := folder(t, tables)
		for _, name := range []string{"read-me.txt", "nodes.csv", "members.csv", "triangles.csv", "supports.csv", "reactions.csv"} {
			require.Contains(t, got, name)
		}
		require.Contains(t, got["read-me.txt"], "Tension is positive")
	}
	archive := filepath.Join(dir, "engineer.zip")
	require.Equal(t, exitFine, run(t, "", "export", form, "--to", "handover", "-o", archive).code)
	text, err := os.ReadFile(archive)
	require.NoError(t, err)
	require.True(t, strings.HasPrefix(string(text), "PK"))
	// A result folder is not replaced, nor is somebody else's.
	require.Equal(t, exitFine, run(t, "", "export", form, "--to", "handover", "-o", form).code)
	after := folder(t, form)
	for name := range before {
		require.Contains(t, after, name)
	}
	theirs := filepath.Join(dir, "theirs")
	require.NoError(t, os.Mkdir(theirs, 0o777))
	require.NoError(t, os.WriteFile(filepath.Join(theirs, "novel.txt"), nil, 0o666))
	e := run(t, "", "export", form, "--to", "handover", "-o", theirs)
	require.Equal(t, exitBadInput, e.code)
	require.Contains(t, e.err, "--force")
}

func TestBrokenModelsEndWithTwoAndTheRightLine(t *testing.T) {
	files, err := filepath.Glob("../../testdata/broken/*.yaml")
	require.NoError(t, err)
	require.GreaterOrEqual(t, len(files), 60)
	for _, f := range files {
		t.Run(filepath.Base(f), func(t *testing.T) {
			text, err := os.ReadFile(f)
			require.NoError(t, err)
			out := filepath.Join(t.TempDir(), "out")
			args := []string{"form", f, "-o", out}
			where := []string{}
			for line := range strings.Lines(string(text)) {
				if place, ok := strings.CutPrefix(line, "# expect: "); ok {
					where = append(where, strings.Fields(place)[0])
				} else if set, ok := strings.CutPrefix(line, "# set: "); ok {
					args = append(args, "--set", strings.TrimSpace(set))
				}
			}
			require.NotEmpty(t, where)
			r := run(t, "", args...)
			require.Equal(t, exitBadInput, r.code, r.err)
			for _, w := range where {
				switch {
				case w == "set":
					require.Contains(t, r.err, "--set ")
				case w == "?":
				case strings.Contains(w, ".csv"):
					require.Contains(t, r.err, w+": ")
				default:
					require.Contains(t, r.err, filepath.Base(f)+":"+w+": ")
				}
			}
			require.Empty(t, r.out)
			_, err = os.Stat(out)
			require.ErrorIs(t, err, os.ErrNotExist, "nothing half-written")
		})
	}
}

func TestATamperedFormIsFoundOut(t *testing.T) {
	r := run(t, small, "form", "-")
	require.Equal(t, exitFine, r.code, r.err)
	var form map[string]any
	require.NoError(t, json.Unmarshal([]byte(r.out), &form))
	nodes := form["nodes"].([]any)
	for _, n := range nodes {
		node := n.(map[string]any)
		fixed := node["fixed"].([]any)
		if fixed[2] == false {
			p := node["position"].([]any)
			p[2] = p[2].(float64) + 1e-4
			break
		}
	}
	b, err := json.Marshal(form)
	require.NoError(t, err)
	c := run(t, string(b), "check", "-")
	require.Equal(t, exitNotTrusted, c.code, c.err)
	require.Contains(t, c.out, "NOT TRUSTED")
	require.Contains(t, c.out, "changed or damaged")
}

func TestABrokenLimitEndsWithThreeAndSaysWhere(t *testing.T) {
	m := small + "limits: {reaction: {most: 1 kN}}\n"
	dir := t.TempDir()
	r := run(t, "", "form", write(t, dir, "m.yaml", m))
	if r.code == exitBadInput {
		r = run(t, "", "form", write(t, dir, "m.yaml", small+"limits: {reaction max: 1 kN}\n"))
	}
	require.Equal(t, exitNotTrusted, r.code, r.err)
	require.Regexp(t, `broken: .*kN`, r.out)
}

func TestAnEdgeCableTooWeakHasNoShape(t *testing.T) {
	dir := t.TempDir()
	m := strings.ReplaceAll(small, "force: 22 kN", "force: 2 kN")
	m = strings.ReplaceAll(m, "sag: 10 %", "force: 2 kN")
	p := write(t, dir, "weak.yaml", m)
	require.NoError(t, os.MkdirAll(filepath.Join(dir, "weak-form"), 0o755))
	require.Equal(t, exitFine, run(t, "", "form", write(t, dir, "good.yaml", small), "-o", filepath.Join(dir, "weak-form")).code)
	r := run(t, "", "form", p)
	require.Equal(t, exitNotTrusted, r.code, r.err)
	files := folder(t, filepath.Join(dir, "weak-form"))
	require.NotContains(t, files, "form.json", "yesterday's shape does not survive")
	require.NotContains(t, files, "form.glb")
	require.Contains(t, files["summary.txt"], "No shape")
}

func TestSomebodyElsesFolderIsNotOverwritten(t *testing.T) {
	dir := t.TempDir()
	m := write(t, dir, "sail.yaml", small)
	other := filepath.Join(dir, "photos")
	require.NoError(t, os.Mkdir(other, 0o755))
	write(t, other, "holiday.jpg", "x")
	r := run(t, "", "form", m, "-o", other)
	require.Equal(t, exitBadInput, r.code)
	require.Contains(t, r.err, "--force")
	require.Equal(t, map[string]string{"holiday.jpg": "x"}, folder(t, other))
	require.Equal(t, exitFine, run(t, "", "form", m, "-o", other, "--force").code)
	require.Contains(t, folder(t, other), "form.json")
}

func TestInterruptedEndsWith130AndWritesNothing(t *testing.T) {
	dir := t.TempDir()
	m := write(t, dir, "sail.yaml", small)
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	var out, errs bytes.Buffer
	code := Run(ctx, []string{"form", m}, Streams{In: strings.NewReader(""), Out: &out, Err: &errs})
	require.Equal(t, exitInterrupted, code, errs.String())
	_, err := os.Stat(filepath.Join(dir, "sail-form"))
	require.ErrorIs(t, err, os.ErrNotExist)
}

func TestUsageErrorsEndWithTwo(t *testing.T) {
	for _, args := range [][]string{
		{"frm", "x.yaml"}, {"form"}, {"form", "a", "b"}, {"form", "--methd", "x"}, {"form", "nothere.yaml"},
		{"check", "nothere.json"}, {"export", "nothere.json", "--to", "glb"}, {"export", "--to", "glb"},
		{"sample", "castle"}, {"schema", "castle"}, {"form", ".", "-o", "x"}, {"form", "x.yaml", "--method", "magic"},
	} {
		r := run(t, "", args...)
		require.Equal(t, exitBadInput, r.code, "%v: %s", args, r.err)
		require.NotEmpty(t, r.err, "%v", args)
		require.NotContains(t, r.err, "goroutine")
	}
	require.Contains(t, run(t, "", "frm").err, "form")
}

func TestEverySampleForms(t *testing.T) {
	for _, s := range spec.Samples() {
		t.Run(s.Name, func(t *testing.T) {
			r := run(t, "", "sample", s.Name)
			require.Equal(t, exitFine, r.code)
			f := run(t, r.out, "form", "-", "-o", filepath.Join(t.TempDir(), "out"))
			require.Equal(t, exitFine, f.code, f.err+f.out)
		})
	}
}

func TestHelpShowsARealExampleForEveryCommand(t *testing.T) {
	for _, c := range []string{"form", "mesh", "check", "export", "compare", "sample", "schema", "version"} {
		r := run(t, "", c, "--help")
		require.Equal(t, exitFine, r.code)
		require.Contains(t, r.out, "anticlast "+c, c)
	}
	require.Contains(t, run(t, "", "--help").out, "preliminary design")
}

func TestCompareSaysWhatChanged(t *testing.T) {
	dir := t.TempDir()
	m := write(t, dir, "sail.yaml", small)
	a, b := filepath.Join(dir, "a"), filepath.Join(dir, "b")
	require.Equal(t, exitFine, run(t, "", "form", m, "-o", a).code)
	require.Equal(t, exitFine, run(t, "", "form", m, "-o", b, "--set", "points.A.z=5").code)
	r := run(t, "", "compare", a, b, "--glb", filepath.Join(dir, "both.glb"), "--report", filepath.Join(dir, "both.html"))
	require.Equal(t, exitFine, r.code, r.err)
	require.Contains(t, r.out, "highest point")
	require.Contains(t, r.out, "preliminary design")
	require.FileExists(t, filepath.Join(dir, "both.glb"))
	require.FileExists(t, filepath.Join(dir, "both.html"))
	j := run(t, "", "compare", a, b, "--json")
	var got struct {
		Rows []struct {
			Group string
			A, B  *float64
		}
	}
	require.NoError(t, json.Unmarshal([]byte(j.out), &got))
	require.Equal(t, "highest point", got.Rows[0].Group)
	require.InDelta(t, 4, *got.Rows[0].A, 1e-9)
	require.InDelta(t, 5, *got.Rows[0].B, 1e-9)
	require.Equal(t, exitBadInput, run(t, "", "compare", a).code)
	require.Equal(t, exitBadInput, run(t, "", "compare", a, filepath.Join(dir, "none")).code)
}

func TestExitCodesOfTheBuiltProgram(t *testing.T) {
	bin := filepath.Join(t.TempDir(), "anticlast")
	build := exec.Command("go", "build", "-o", bin, ".")
	out, err := build.CombinedOutput()
	require.NoError(t, err, string(out))
	code := func(in string, args ...string) int {
		c := exec.Command(bin, args...)
		c.Stdin = strings.NewReader(in)
		c.Stdout, c.Stderr = io.Discard, io.Discard
		c.Dir = t.TempDir()
		_ = c.Run()
		return c.ProcessState.ExitCode()
	}
	require.Equal(t, exitFine, code(small, "form", "-"))
	require.Equal(t, exitFine, code("", "version"))
	require.Equal(t, exitBadInput, code("anticlast: 1\n", "form", "-"))
	require.Equal(t, exitBadInput, code("", "form", "missing.yaml"))
}

// The volume of air is a value like any other: it can be set, what is found is
// printed, and a file that claims another volume is not trusted.
func TestAVolumeIsSetPrintedAndChecked(t *testing.T) {
	m := write(t, t.TempDir(), "dome.yaml", `anticlast: 1
mesh: 1 m
points: {A: [0, 0, 0], B: [6, 0, 0], C: [6, 6, 0], D: [0, 6, 0]}
edges:
  AB: {from: A, to: B, fixed: straight}
  BC: {from: B, to: C, fixed: straight}
  CD: {from: C, to: D, fixed: straight}
  DA: {from: D, to: A, fixed: straight}
fabrics:
  dome: {boundary: [AB, BC, CD, DA], prestress: 2 kN/m, volume: 30 m3}
`)
	pressure := func(args ...string) float64 {
		r := run(t, "", append([]string{"form", m, "-o", "-"}, args...)...)
		require.Equal(t, exitFine, r.code, r.err)
		var form struct {
			Air []struct {
				Name, Fabrics              any
				Volume, Enclosed, Pressure float64
			} `json:"air"`
		}
		require.NoError(t, json.Unmarshal([]byte(r.out), &form))
		require.Len(t, form.Air, 1)
		require.InEpsilon(t, form.Air[0].Volume, form.Air[0].Enclosed, 1e-9)
		return form.Air[0].Pressure
	}
	p30 := pressure()
	require.Greater(t, pressure("--set", "fabrics.dome.volume=40 m3"), p30)
	require.InEpsilon(t, -p30, pressure("--set", "fabrics.dome.volume=-30000 l"), 1e-6)
	require.InDelta(t, 0, pressure("--set", "fabrics.dome.volume=1e-9"), 1e-6)
	r := run(t, "", "form", m)
	require.Equal(t, exitFine, r.code, r.err)
	require.Regexp(t, `air below +closed by +asked m³ +encloses m³ +pressure Pa\n +dome +its boundary's plane +30\.00 +30\.00 +[0-9.]+\n`, r.out)
	r = run(t, "", "form", m, "--set", "fabrics.dome.pressure=200 Pa")
	require.Equal(t, exitBadInput, r.code)
	require.Contains(t, r.err, "has a volume and a pressure")

	r = run(t, "", "form", m, "-o", "-")
	require.Equal(t, exitFine, run(t, r.out, "check", "-").code)
	c := run(t, strings.Replace(r.out, `"volume":30,`, `"volume":30.001,`, 1), "check", "-")
	require.Equal(t, exitNotTrusted, c.code)
	require.Contains(t, c.out, "encloses 30 m³ where 30.001 m³ are given")
}
