package main

import (
	"bufio"
	"context"
	"encoding/json"
	"fmt"
	"io"
	"math"
	"strings"

	"github.com/spf13/cobra"
	"gonum.org/v1/gonum/spatial/r3"

	"anticlast/export"
	"anticlast/formfind/canopy"
	"anticlast/formfind/mesh"
)

func (a *app) meshCommand() *cobra.Command {
	var set []string
	var svg string
	c := &cobra.Command{
		Use:   "mesh MODEL",
		Short: "Show the mesh of a model before any solving",
		Long: `Divides a model into nodes, members and triangles as form does, and shows the
mesh instead of solving it: how many there are of what, how even the triangles
are, where they are poor, and the points of the model with their names, among
them those that an outline drawn elsewhere gave. --svg draws it.

` + canopy.Caution,
		Example: `  anticlast mesh sail.yaml
  anticlast mesh sail.yaml --set mesh=200mm --svg mesh.svg
  anticlast mesh sail.yaml --json`,
		Args:              args(1, 1, "one model file"),
		RunE:              func(cmd *cobra.Command, args []string) error { return a.mesh(cmd.Context(), args[0], set, svg) },
		ValidArgsFunction: completeFiles("yaml", "yml"),
	}
	c.Flags().StringArrayVar(&set, "set", nil, "change a value of the model for this run, `PATH=VALUE`; may be repeated")
	c.Flags().StringVar(&svg, "svg", "", "draw the mesh to `FILE` (- for standard output, which then holds nothing else)")
	return c
}

func (a *app) mesh(ctx context.Context, path string, set []string, svg string) error {
	m, err := a.readModel(ctx, path, set)
	if err != nil {
		return err
	}
	s, free, err := mesh.BuildMeasured(ctx, m)
	if err != nil {
		return modelError{path, err}
	}
	r := reportMesh(m, s, free)
	if svg != "" {
		draw := func(w io.Writer) error {
			return export.MeshSVG(ctx, w, s, export.MeshDrawing{Title: r.Title, Nodes: r.points, Triangles: r.poor})
		}
		if svg == "-" {
			if a.json {
				return usageError{fmt.Errorf("--json and --svg - both want standard output; name a file for the drawing")}
			}
			return draw(a.Out)
		}
		if err := writeWhole(svg, draw); err != nil {
			return err
		}
	}
	switch {
	case a.json:
		b, err := json.MarshalIndent(r, "", "  ")
		if err != nil {
			return err
		}
		_, err = fmt.Fprintf(a.Out, "%s\n", b)
		return err
	case a.quiet:
		return nil
	}
	return r.write(a.Out, svg)
}

// poorAngle is below what triangles are doubtful; common practice.
const poorAngle = 20 * math.Pi / 180

// angleClasses are the upper bounds, in degrees, of the histogram of smallest
// angles. 28° is what free meshing aims at, 60° the most there can be.
var angleClasses = []float64{10, 20, 28, 35, 40, 45, 50, 55, 60}

// meshReport is what the command says; the fields are those of --json.
type meshReport struct {
	Caution   string       `json:"caution"`
	Title     string       `json:"title"`
	Nodes     int          `json:"nodes"`
	Members   int          `json:"members"`
	Triangles int          `json:"triangles"`
	Supported int          `json:"supported_nodes"`
	Kinds     []kindCount  `json:"member_kinds"`
	Fabrics   []fabricMesh `json:"fabrics"`
	Angles    []angleClass `json:"smallest_angles"`
	Problems  []string     `json:"problems"`
	Points    []meshPoint  `json:"points"`

	points []int32
	poor   []int32
}

type kindCount struct {
	Kind  string `json:"kind"`
	Count int    `json:"count"`
}

type fabricMesh struct {
	Name       string  `json:"name"`
	Triangles  int     `json:"triangles"`
	Area       float64 `json:"area_m2"`
	Shortest   float64 `json:"shortest_side_m"`
	Mean       float64 `json:"mean_side_m"`
	Longest    float64 `json:"longest_side_m"`
	LeastAngle float64 `json:"least_angle_deg"`
	MeanAngle  float64 `json:"mean_least_angle_deg"`
	Mesh       string  `json:"mesh"` // free, structured or given
	sides      float64
}

type angleClass struct {
	To    float64 `json:"to_deg"`
	Count int     `json:"count"`
}

type meshPoint struct {
	Name string     `json:"name"`
	At   [3]float64 `json:"position_m"`
	Is   string     `json:"is"`
}

func reportMesh(m *canopy.Model, s *canopy.Structure, free []mesh.Quality) *meshReport {
	r := &meshReport{Caution: canopy.Caution, Title: m.Title, Nodes: len(s.Position), Members: len(s.Ends), Triangles: len(s.Corners),
		Kinds: []kindCount{}, Fabrics: []fabricMesh{}, Angles: []angleClass{}, Problems: []string{}, Points: []meshPoint{}}
	if r.Title == "" {
		r.Title = m.File
	}
	for i := range s.Position {
		if s.Fixed[i] != 0 {
			r.Supported++
		}
	}
	kinds := map[canopy.Kind]int{}
	for _, k := range s.Kind {
		kinds[k]++
	}
	for k := canopy.KindCable; k <= canopy.KindStrut; k++ {
		if kinds[k] > 0 {
			r.Kinds = append(r.Kinds, kindCount{k.String(), kinds[k]})
		}
	}
	r.triangles(s)
	for i := range r.Fabrics {
		if r.Fabrics[i].Mesh = "structured"; m.Listed != nil {
			r.Fabrics[i].Mesh = "given"
		}
	}
	for _, q := range free {
		for i := range r.Fabrics {
			if r.Fabrics[i].Name == q.Fabric {
				r.Fabrics[i].Mesh = "free"
			}
		}
		if !q.Met {
			r.Problems = append(r.Problems, fmt.Sprintf("fabric %s near (%.2f, %.2f, %.2f) m: %s", q.Fabric, q.At.X, q.At.Y, q.At.Z, q.Why))
		}
		if q.Sharp > 0 {
			p := s.Position[q.Corner]
			r.Problems = append(r.Problems, fmt.Sprintf("fabric %s has %d sharp corner%s, the sharpest of %.1f° at %s (%.2f, %.2f, %.2f) m: triangles there are as thin as the corner",
				q.Fabric, q.Sharp, plural(q.Sharp), q.CornerAngle*180/math.Pi, s.NodeName.At(int(q.Corner)), p.X, p.Y, p.Z))
		}
	}
	node := map[string]int32{}
	for i := range s.Position {
		if n := s.NodeName.At(i); len(m.Points) > 0 {
			node[n] = int32(i)
		}
	}
	for _, p := range m.Points {
		i, ok := node[p.Name]
		is := "not used"
		if ok {
			is = "free"
			r.points = append(r.points, i)
			switch {
			case s.Held != nil && s.Held[i] != 0:
				is = "held"
			case s.Fixed[i] == canopy.DirAll:
				is = "supported"
			case s.Fixed[i] != 0:
				is = "partly supported"
			}
		}
		r.Points = append(r.Points, meshPoint{p.Name, [3]float64{p.At.X, p.At.Y, p.At.Z}, is})
	}
	return r
}

// triangles measures the triangles.
func (r *meshReport) triangles(s *canopy.Structure) {
	if len(s.Corners) == 0 {
		return
	}
	for _, f := range s.Fabrics {
		r.Fabrics = append(r.Fabrics, fabricMesh{Name: f.Name, Shortest: math.Inf(1), LeastAngle: 180})
	}
	for _, c := range angleClasses {
		r.Angles = append(r.Angles, angleClass{To: c})
	}
	for t, c := range s.Corners {
		p, q, o := s.Position[c[0]], s.Position[c[1]], s.Position[c[2]]
		l := [3]float64{r3.Norm(r3.Sub(q, p)), r3.Norm(r3.Sub(o, q)), r3.Norm(r3.Sub(p, o))}
		twice := r3.Norm(r3.Cross(r3.Sub(q, p), r3.Sub(o, p)))
		angle := math.Asin(min(1, twice*min(l[0], l[1], l[2])/(l[0]*l[1]*l[2]))) // smallest: opposite the shortest side
		f := &r.Fabrics[s.FabricOf[t]]
		f.Triangles++
		f.Area += twice / 2
		f.sides += l[0] + l[1] + l[2]
		f.Shortest, f.Longest = min(f.Shortest, l[0], l[1], l[2]), max(f.Longest, l[0], l[1], l[2])
		f.LeastAngle = min(f.LeastAngle, angle*180/math.Pi)
		f.MeanAngle += angle * 180 / math.Pi
		for k := range r.Angles {
			if angle*180/math.Pi <= r.Angles[k].To || k == len(r.Angles)-1 {
				r.Angles[k].Count++
				break
			}
		}
		if angle < poorAngle {
			r.poor = append(r.poor, int32(t))
			if len(r.poor) <= 10 {
				at := r3.Scale(1.0/3, r3.Add(p, r3.Add(q, o)))
				r.Problems = append(r.Problems, fmt.Sprintf("triangle %s near (%.2f, %.2f, %.2f) m has an angle of %.1f°", s.TrianglePlace(s.Position, int32(t)).Name, at.X, at.Y, at.Z, angle*180/math.Pi))
			}
		}
	}
	if n := len(r.poor) - 10; n > 0 {
		r.Problems = append(r.Problems, fmt.Sprintf("%d more triangles have an angle below %.0f°", n, poorAngle*180/math.Pi))
	}
	for i := range r.Fabrics {
		f := &r.Fabrics[i]
		if f.Triangles == 0 {
			f.Shortest, f.LeastAngle = 0, 0
			continue
		}
		f.Mean = f.sides / float64(3*f.Triangles)
		f.MeanAngle /= float64(f.Triangles)
	}
}

func (r *meshReport) write(w io.Writer, svg string) error {
	b := bufio.NewWriter(w)
	fmt.Fprintf(b, "%s\n%d nodes (%d supported), %d members, %d triangles\n", r.Title, r.Nodes, r.Supported, r.Members, r.Triangles)
	var kinds []string
	for _, k := range r.Kinds {
		kinds = append(kinds, fmt.Sprintf("%d of %s", k.Count, k.Kind))
	}
	if len(kinds) > 0 {
		fmt.Fprintf(b, "members: %s\n", strings.Join(kinds, ", "))
	}
	if len(r.Fabrics) > 0 {
		wide := len("fabric")
		for _, f := range r.Fabrics {
			wide = max(wide, len([]rune(f.Name)))
		}
		fmt.Fprintf(b, "\n  %-*s  triangles   area m²  sides m: least   mean  longest  angles: least  mean  mesh\n", wide, "fabric")
		for _, f := range r.Fabrics {
			fmt.Fprintf(b, "  %-*s  %9d  %8.1f  %14.3f  %5.3f  %7.3f  %12.1f°  %4.1f  %s\n", wide, f.Name, f.Triangles, f.Area, f.Shortest, f.Mean, f.Longest, f.LeastAngle, f.MeanAngle, f.Mesh)
		}
		most := 1
		for _, c := range r.Angles {
			most = max(most, c.Count)
		}
		fmt.Fprintf(b, "\nSmallest angle of each triangle\n")
		from := 0.0
		for _, c := range r.Angles {
			bar := strings.Repeat("█", int(math.Round(40*float64(c.Count)/float64(most))))
			if c.Count > 0 && bar == "" {
				bar = "▏"
			}
			fmt.Fprintf(b, "%s\n", strings.TrimRight(fmt.Sprintf("  %2.0f … %2.0f°  %8d  %s", from, c.To, c.Count, bar), " "))
			from = c.To
		}
	}
	const show = 40
	if len(r.Points) > 0 {
		wide := len("point")
		for _, p := range r.Points {
			wide = max(wide, len([]rune(p.Name)))
		}
		fmt.Fprintf(b, "\n  %-*s       x m       y m       z m\n", wide, "point")
		for i, p := range r.Points {
			if i == show && len(r.Points) > show+1 {
				fmt.Fprintf(b, "  … and %d more (--json lists them)\n", len(r.Points)-show)
				break
			}
			fmt.Fprintf(b, "  %-*s  %8.3f  %8.3f  %8.3f  %s\n", wide, p.Name, p.At[0], p.At[1], p.At[2], p.Is)
		}
	}
	if len(r.Problems) > 0 {
		fmt.Fprintf(b, "\nProblems\n")
		for _, p := range r.Problems {
			fmt.Fprintf(b, "  %s\n", p)
		}
	} else {
		fmt.Fprintf(b, "\nNo problems found.\n")
	}
	if svg != "" {
		fmt.Fprintf(b, "Drawn to %s.\n", svg)
	}
	return b.Flush()
}

func plural(n int) string {
	if n == 1 {
		return ""
	}
	return "s"
}
