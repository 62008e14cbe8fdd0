package export

import (
	"bytes"
	"encoding/json"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"testing"

	"anticlast/formfind/canopy"

	"github.com/stretchr/testify/require"
)

func reportOf(t *testing.T, r *canopy.Result, o Options) string {
	t.Helper()
	var b bytes.Buffer
	require.NoError(t, writeReport(background, &b, r, o))
	return b.String()
}

func TestReportTellsTheStory(t *testing.T) {
	r := sail(10)
	r.Form.Steps = []string{"one linear solve"}
	s := reportOf(t, r, quick)
	for _, want := range []string{"Quay market sail", "the audit trusts it", canopy.Caution, ">Plan<", "Elevation", "Reactions and actions on foundations",
		"G1 anchor", "58.40", "The flattest place slopes 4.1°", "common practice", "one linear solve", "virial", "1.001 (0.950 … 1.050)"} {
		require.Contains(t, s, want)
	}
	require.Less(t, strings.Index(s, ">Plan<"), strings.Index(s, "Elevation"), "the plan first")
	r.Audit.Trusted, r.Audit.Reasons = false, []string{"It moves <b>"}
	s = reportOf(t, r, quick)
	require.Contains(t, s, "Not trusted")
	require.Contains(t, s, "It moves &lt;b&gt;")
}

// Nothing in the page comes from elsewhere, and nothing in a model becomes markup.
func TestReportIsSelfContainedAndEscapes(t *testing.T) {
	r := sail(6)
	evil := `</script><img src="http://x.example/" onerror="alert(1)">`
	r.Title, r.Structure.Cables[0].Name, r.Structure.Fabrics[0].Name = evil, evil, evil
	r.Findings[0].Text = evil
	s := reportOf(t, r, quick)
	require.NotContains(t, s, "<img src")
	require.Equal(t, 2, strings.Count(s, "</script>"))
	outside := regexp.MustCompile(`(?:src|href)="([^"]*)"`)
	for _, m := range outside.FindAllStringSubmatch(s, -1) {
		require.True(t, strings.HasPrefix(m[1], "data:"), m[1])
	}
	require.NotContains(t, strings.ReplaceAll(s, "http://x.example/", ""), "http://")
	require.NotContains(t, s, "https://")
}

func TestReportsOfOtherForms(t *testing.T) {
	for name, r := range scenes() {
		s := regexp.MustCompile(`(base64,|":")[A-Za-z0-9+/=]{100,}`).ReplaceAllString(reportOf(t, r, quick), "")
		require.NotContains(t, strings.ReplaceAll(s, reportScript, ""), "NaN", name)
	}
}

// Ten thousand triangles stay under a megabyte.
func TestReportIsSmall(t *testing.T) {
	r := sail(71)
	require.Greater(t, len(r.Structure.Corners), 10000)
	require.Less(t, len(reportOf(t, r, Options{})), 1<<20)
}

// In a browser: no error, no request, the canvas shows the shape, dragging turns
// it, hovering tells values, it prints, and without scripts there is a drawing.
func TestReportInABrowser(t *testing.T) {
	t.Parallel()
	node := tool(t, "node")
	home := os.Getenv("ANTICLAST_NODE_MODULES")
	if _, err := os.Stat(filepath.Join(home, "node_modules", "playwright-core")); err != nil {
		absent(t, "npm package playwright-core (ANTICLAST_NODE_MODULES names the folder it was installed in)")
	}
	if os.Getenv("ANTICLAST_CHROMIUM") == "" {
		if _, err := exec.LookPath("chromium"); err != nil {
			absent(t, "chromium")
		}
	}
	r := sail(24)
	type picture struct {
		Share float64
		Sum   int
	}
	var seen struct {
		Errors, Requests                  []string
		Live, Still, Wide, PhoneWide      bool
		First, Turned, Keyed, Back, Layer picture
		Tips                              []string
		Pressed                           string
		Pages                             int
		WithoutScripts                    struct{ Still, Live bool }
	}
	args := []string{"testdata/view_report.mjs", saved(t, "report", r)}
	if shots := os.Getenv("ANTICLAST_SCREENSHOTS"); shots != "" {
		args = append(args, shots)
	}
	out, err := exec.Command(node, args...).Output()
	require.NoError(t, err)
	require.NoError(t, json.Unmarshal(out, &seen), string(out))
	require.Empty(t, seen.Errors)
	require.Empty(t, seen.Requests)
	require.True(t, seen.Live)
	require.False(t, seen.Still)
	require.Greater(t, seen.First.Share, 0.05)
	require.NotEqual(t, seen.First.Sum, seen.Turned.Sum)
	require.NotEqual(t, seen.First.Sum, seen.Keyed.Sum)
	require.Equal(t, seen.First, seen.Back)
	require.NotEqual(t, seen.First.Sum, seen.Layer.Sum)
	require.Equal(t, "true", seen.Pressed)
	require.False(t, seen.Wide)
	require.False(t, seen.PhoneWide)
	require.Equal(t, struct{ Still, Live bool }{true, false}, seen.WithoutScripts)
	require.GreaterOrEqual(t, seen.Pages, 3)
	require.LessOrEqual(t, seen.Pages, 12)
	// The tips of triangles tell the form's own values.
	told := 0
	triangle := regexp.MustCompile(`^triangle (\d+), sail\nwarp achieved ([\d.]+)\nweft achieved ([\d.]+)\n`)
	for _, tip := range seen.Tips {
		if m := triangle.FindStringSubmatch(tip); m != nil {
			told++
			i := int(num(t, m[1]))
			require.InDelta(t, r.Form.Stress[i].Warp/2500, num(t, m[2]), 1e-3)
			require.InDelta(t, r.Form.Stress[i].Weft/2000, num(t, m[3]), 1e-3)
		}
	}
	require.Greater(t, told, 3, seen.Tips)
}

func BenchmarkReport(b *testing.B) {
	r := sail(sweepN(71, 200, 300))
	for b.Loop() {
		if err := writeReport(background, io.Discard, r, Options{}); err != nil {
			b.Fatal(err)
		}
	}
}
