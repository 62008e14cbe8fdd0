package main

import (
	"bufio"
	"context"
	"fmt"
	"io"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"anticlast/formfind"
	"anticlast/formfind/canopy"
)

func (a *app) checkCommand() *cobra.Command {
	var set []string
	c := &cobra.Command{
		Use:   "check FILE",
		Short: "Audit a form.json or a model, and hold its limits against it",
		Long: `Audits a result: is it in balance, stable, in tension where it says so, and does
it meet its limits? Everything is recomputed.

FILE is a form.json (or the folder it is in), which is audited from the file
alone, or a model file, which is formed first without writing anything. - reads
either from standard input.

` + canopy.Caution,
		Example: `  anticlast check sail-form/form.json
  anticlast check sail.yaml --set points.M1.z=7.5
  anticlast form sail.yaml -o - | anticlast check - --json`,
		Args:              args(1, 1, "one form.json or model file"),
		RunE:              func(cmd *cobra.Command, args []string) error { return a.check(cmd.Context(), args[0], set) },
		ValidArgsFunction: completeFiles("json", "yaml", "yml"),
	}
	c.Flags().StringArrayVar(&set, "set", nil, "change a value of a model for this run, `PATH=VALUE`; may be repeated")
	return c
}

func (a *app) check(ctx context.Context, path string, set []string) error {
	var r *canopy.Result
	isForm := strings.EqualFold(filepath.Ext(path), ".json") || isFolder(path)
	if path == "-" {
		in := bufio.NewReader(a.In)
		isForm = startsWithBrace(in)
		a.In = in
	}
	if isForm {
		if len(set) > 0 {
			return usageError{fmt.Errorf("--set changes a model; %s is a result", path)}
		}
		var err error
		if r, err = a.readForm(ctx, path); err != nil {
			return err
		}
		said := r.Audit.Trusted
		if err := formfind.Judge(ctx, r); err != nil {
			return err
		}
		if said && !r.Audit.Trusted {
			r.Audit.Reasons = append(r.Audit.Reasons, "the file says it is trusted, but it was changed or damaged since")
		}
	} else {
		m, err := a.readModel(ctx, path, set)
		if err != nil {
			return err
		}
		bar := newProgress(a.Streams, a.quiet)
		r, err = formfind.Find(ctx, m, formfind.Options{Progress: bar.step})
		bar.done()
		if err != nil {
			return modelError{path, err}
		}
		r.Program.Name, r.Program.Version = "anticlast", version
	}
	switch {
	case a.json:
		if err := writeHead(a.Out, r, nil); err != nil {
			return err
		}
	case !a.quiet:
		if err := writeAudit(a.Out, r); err != nil {
			return err
		}
	}
	return a.judge(r)
}

// startsWithBrace looks at the first letter that is not white space.
func startsWithBrace(r *bufio.Reader) bool {
	for n := 1; n <= r.Size(); n++ {
		b, err := r.Peek(n)
		if len(b) < n || err != nil && err != io.EOF {
			return false
		}
		switch b[n-1] {
		case ' ', '\t', '\n', '\r':
		default:
			return b[n-1] == '{'
		}
	}
	return false
}
