package main

import (
	"bufio"
	"fmt"
	"io"
	"math"

	"anticlast/formfind/audit"
	"anticlast/formfind/canopy"
)

// writeAudit prints every number of the audit beside what it is held against,
// then the findings.
func writeAudit(w io.Writer, r *canopy.Result) error {
	b := bufio.NewWriter(w)
	u, tol := &r.Audit, audit.Defaults()
	s := r.Structure
	if r.Title != "" {
		fmt.Fprintf(b, "%s\n", r.Title)
	}
	fmt.Fprintf(b, "%d nodes, %d members, %d triangles\n\n", len(s.Position), len(s.Ends), len(s.Corners))
	row := func(what string, value, limit float64) {
		mark := "ok"
		if !(value <= limit) {
			mark = "NOT MET"
		}
		fmt.Fprintf(b, "  %-52s %9.1e  of %7.0e  %s\n", what, value, limit, mark)
	}
	fmt.Fprintln(b, "Balance, recomputed from the reported forces and stresses")
	row("nodal residual, root mean square", u.ResidualRMS, tol.Residual)
	row("nodal residual, worst over the largest force", u.ResidualWorst, tol.Worst)
	row("largest residual of the forces at one node", u.ResidualLargest, tol.Largest)
	row("reactions against loads, forces", u.ForceBalance, tol.Balance)
	row("reactions against loads, moments", u.MomentBalance, tol.Balance)
	row("virial identity from reported stresses", u.Virial, tol.Balance)
	row("reported against recomputed reactions", u.ReactionMismatch, tol.Reaction)
	if len(s.Enclosures) > 0 {
		row("volumes of air against those asked for", u.VolumeMismatch, tol.Volume)
	}

	held := ""
	if len(s.Enclosures) > 0 {
		held = ", volumes of air held"
	}
	fmt.Fprintf(b, "\nStability for the prescribed stress%s\n", held)
	switch {
	case !u.StabilityKnown:
		fmt.Fprintf(b, "  not known: %s\n", u.StabilityNote)
	case u.Unstable > 0:
		fmt.Fprintf(b, "  UNSTABLE in %d directions\n", u.Unstable)
	case math.IsNaN(u.Softest):
		fmt.Fprintf(b, "  stable (%s)\n", u.StabilityNote)
	default:
		fmt.Fprintf(b, "  stable; firmness %.3g, softest at node %s\n", u.Softest, s.NodeName.At(int(u.SoftestNode)))
		if u.StabilityNote != "" {
			fmt.Fprintf(b, "  %s\n", u.StabilityNote)
		}
	}

	fmt.Fprintln(b, "\nTension and mesh")
	fmt.Fprintf(b, "  slack cables %d, pushed cables %d, triangles with compression %d\n", u.SlackCables, u.PushedCables, u.CompressedTriangles)
	if len(s.Corners) > 0 {
		fmt.Fprintf(b, "  smallest angle %.1f° (triangle %s), mean of the smallest angles %.1f°\n",
			u.MinAngle*180/math.Pi, s.TrianglePlace(r.Form.Position, u.MinAngleTri).Name, u.MeanAngleMin*180/math.Pi)
	}
	if len(r.Findings) > 0 {
		fmt.Fprintln(b, "\nFindings")
		for _, f := range r.Findings {
			fmt.Fprintf(b, "  %s: %s (%s)\n", f.Severity, f.Text, f.Source)
		}
	}
	fmt.Fprintln(b)
	if u.Trusted {
		fmt.Fprintln(b, "The audit trusts this result.")
	} else {
		fmt.Fprintln(b, "NOT TRUSTED:")
		for _, t := range u.Reasons {
			fmt.Fprintf(b, "  - %s\n", t)
		}
	}
	fmt.Fprintln(b, canopy.Caution)
	return b.Flush()
}
