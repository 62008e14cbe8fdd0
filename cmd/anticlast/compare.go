package main

import (
	"context"
	"encoding/json"
	"fmt"
	"io"
	"math"

	"github.com/spf13/cobra"

	"anticlast/export"
	"anticlast/formfind/canopy"
)

type compareFlags struct {
	glb, report string
}

func (a *app) compareCommand() *cobra.Command {
	var f compareFlags
	c := &cobra.Command{
		Use:   "compare A B",
		Short: "Show two forms side by side: what changed, and both shapes",
		Long: `Compares two results (form.json or the folders they are in), things matched by
name: heights, forces, reactions, areas, cable lengths. --glb writes a scene with
both shapes that morphs from one to the other where their meshes match; --report
a self-contained page.

` + canopy.Caution,
		Example: `  anticlast form sail.yaml
  anticlast form sail.yaml --set points.B.z=7.5 -o higher
  anticlast compare sail-form higher
  anticlast compare sail-form higher --glb both.glb --report both.html`,
		Args:              args(2, 2, "two results"),
		RunE:              func(cmd *cobra.Command, args []string) error { return a.compare(cmd.Context(), args[0], args[1], f) },
		ValidArgsFunction: completeFiles("json"),
	}
	c.Flags().StringVar(&f.glb, "glb", "", "write a scene with both shapes to `FILE`")
	c.Flags().StringVar(&f.report, "report", "", "write a page about both to `FILE`")
	return c
}

func (a *app) compare(ctx context.Context, one, two string, f compareFlags) error {
	ra, err := a.readForm(ctx, one)
	if err != nil {
		return err
	}
	rb, err := a.readForm(ctx, two)
	if err != nil {
		return err
	}
	if f.glb != "" {
		if err := writeWhole(f.glb, func(w io.Writer) error { return export.CompareGLB(ctx, w, ra, rb, export.Options{}) }); err != nil {
			return err
		}
	}
	if f.report != "" {
		if err := writeWhole(f.report, func(w io.Writer) error { return export.CompareReport(ctx, w, ra, rb, export.Options{}) }); err != nil {
			return err
		}
	}
	switch {
	case a.json:
		return a.compareJSON(ra, rb)
	case a.quiet:
		return nil
	}
	return export.Compare(a.Out, ra, rb, a.exportOptions())
}

func (a *app) compareJSON(ra, rb *canopy.Result) error {
	type row struct {
		Group string   `json:"group"`
		Name  string   `json:"name"`
		Unit  string   `json:"unit"`
		A     *float64 `json:"a"`
		B     *float64 `json:"b"`
	}
	known := func(v float64) *float64 {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return nil
		}
		return &v
	}
	out := struct {
		Caution string `json:"caution"`
		A       bool   `json:"a_trusted"`
		B       bool   `json:"b_trusted"`
		Rows    []row  `json:"rows"`
	}{canopy.Caution, ra.Audit.Trusted, rb.Audit.Trusted, []row{}}
	for _, d := range export.Differences(ra, rb) {
		out.Rows = append(out.Rows, row{d.Group, d.Name, d.Unit, known(d.A), known(d.B)})
	}
	b, err := json.MarshalIndent(out, "", "  ")
	if err != nil {
		return err
	}
	_, err = fmt.Fprintf(a.Out, "%s\n", b)
	return err
}
