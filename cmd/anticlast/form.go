package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"anticlast/export"
	"anticlast/formfind"
	"anticlast/formfind/canopy"
	"anticlast/formfind/engine"
	"anticlast/formfind/formfile"
)

type formFlags struct {
	out        string
	set        []string
	also       []string
	method     string
	trace      string
	crossCheck bool
	watch      bool
	force      bool
	times      bool
}

func (a *app) formCommand() *cobra.Command {
	var f formFlags
	c := &cobra.Command{
		Use:   "form MODEL",
		Short: "Find the shape of a model, audit it, and write everything",
		Long: `Finds the equilibrium shape of a model file, audits it, holds the model's limits
against it, prints a summary and writes a folder beside the model (sail.yaml
gives sail-form) or at -o:

  form.json      the whole result, for check and export
  form.glb       for any 3D viewer
  *.csv          nodes, members, triangles, reactions
  summary.txt    what is printed

The folder is replaced as a whole, so it is always from one run. When a model is
shown to have no equilibrium it holds the explanation and no shape.

MODEL may be - for standard input; form.json then goes to standard output unless
-o names a folder. -o - writes form.json to standard output.

` + canopy.Caution,
		Example: `  anticlast form sail.yaml
  anticlast form sail.yaml --set points.M1.z=7.5 -o /tmp/higher
  anticlast form sail.yaml --watch
  anticlast form sail.yaml --cross-check
  anticlast sample cone | anticlast form - | anticlast check -`,
		Args: args(1, 1, "one model file"),
		RunE: func(cmd *cobra.Command, args []string) error {
			if f.watch {
				return a.watch(cmd.Context(), args[0], f)
			}
			return a.form(cmd.Context(), args[0], f)
		},
		ValidArgsFunction: completeFiles("yaml", "yml"),
	}
	fl := c.Flags()
	fl.StringVarP(&f.out, "out", "o", "", "folder to write (default: MODEL-form beside the model); - for form.json on standard output")
	fl.StringArrayVar(&f.set, "set", nil, "change a value of the model for this run, `PATH=VALUE`; may be repeated")
	fl.StringSliceVar(&f.also, "also", nil, "further formats to write into the folder (see anticlast export --list)")
	fl.BoolVar(&f.watch, "watch", false, "form again whenever the model file, or a drawing or table beside it, is saved, until interrupted")
	fl.BoolVar(&f.crossCheck, "cross-check", false, "have a second, independent engine confirm the shape")
	fl.StringVar(&f.method, "method", "auto", "auto, or relax for dynamic relaxation throughout")
	fl.StringVar(&f.trace, "trace", "", "write residual against iteration and time to a CSV `FILE`")
	fl.BoolVar(&f.times, "times", false, "print how long each stage took, on the error stream")
	fl.BoolVar(&f.force, "force", false, "replace a folder this program did not write (it is kept under another name)")
	return c
}

func (a *app) form(ctx context.Context, path string, f formFlags) error {
	method, err := formfind.ParseMethod(f.method)
	if err != nil {
		return usageError{err}
	}
	formats, err := wanted(f.also)
	if err != nil {
		return usageError{err}
	}
	var watch *stopwatch
	if f.times {
		watch = newStopwatch()
		defer watch.print(a.Err)
	}
	watch.begin("read")
	m, err := a.readModel(ctx, path, f.set)
	if err != nil {
		return err
	}
	out := f.out
	switch {
	case out == "" && path == "-":
		out = "-"
	case out == "":
		out = resultFolder(path)
	}

	var rec *engine.Recorder
	if f.trace != "" {
		rec = &engine.Recorder{}
	}
	bar := newProgress(a.Streams, a.quiet)
	r, err := formfind.Find(ctx, m, formfind.Options{
		Method: method, CrossCheck: f.crossCheck, Progress: bar.step, Recorder: rec, Stage: watch.begin,
	})
	bar.done()
	if rec != nil {
		if terr := writeTrace(f.trace, rec); terr != nil && err == nil {
			err = terr
		}
	}
	if err != nil {
		err = modelError{path, err}
		if text, ok := explanation(m, err); ok && out != "-" {
			if werr := export.Explanation(ctx, out, text, export.Options{Force: f.force}); werr != nil {
				return errors.Join(err, werr)
			}
			if !a.quiet {
				fmt.Fprintf(a.Err, "%s holds the explanation and no shape.\n", out)
			}
		}
		return err
	}
	r.Program.Name, r.Program.Version = "anticlast", version

	watch.begin("write")
	if out == "-" {
		if err := formfile.Write(ctx, a.Out, r); err != nil {
			return err
		}
		return a.judge(r)
	}
	if err := export.Folder(ctx, out, r, formats, export.Options{Force: f.force}); err != nil {
		if errors.Is(err, export.ErrForeign) {
			return usageError{fmt.Errorf("%w; name another folder with -o, or add --force to move it aside", err)}
		}
		return err
	}
	switch {
	case a.json:
		if err := writeHead(a.Out, r, map[string]any{"folder": out, "files": fileNames(formats)}); err != nil {
			return err
		}
	case !a.quiet:
		if err := export.Summary(a.Out, r, a.exportOptions()); err != nil {
			return err
		}
		fmt.Fprintf(a.Out, "\nWritten to %s: %s\n", out, strings.Join(fileNames(formats), ", "))
		fmt.Fprintf(a.Out, "Next: open %s in a 3D viewer; anticlast check %s audits the file again.\n",
			filepath.Join(out, "form.glb"), filepath.Join(out, "form.json"))
	}
	return a.judge(r)
}

func (a *app) exportOptions() export.Options {
	return export.Options{Width: min(a.Width, 100), Colour: a.Colour}
}

// judge turns a result that is not to be relied on into the error that ends
// the command with exit code 3.
func (a *app) judge(r *canopy.Result) error {
	if !r.Audit.Trusted {
		return errNotTrusted
	}
	for _, f := range r.Findings {
		if f.Severity == canopy.Broken {
			return errNotTrusted
		}
	}
	return nil
}

// explanation is what the folder holds when there is no shape to show.
func explanation(m *canopy.Model, err error) (string, bool) {
	var none *formfind.NoEquilibriumError
	var stay *formfind.BalanceError
	var b strings.Builder
	if m.Title != "" {
		fmt.Fprintf(&b, "%s\n\n", m.Title)
	}
	switch {
	case errors.As(err, &none):
		fmt.Fprintf(&b, "No shape: %s\n", none.Text)
		if len(none.Tried) > 0 {
			fmt.Fprintf(&b, "\nWhat was tried:\n")
			for _, t := range none.Tried {
				fmt.Fprintf(&b, "- %s\n", t)
			}
		}
	case errors.As(err, &stay) && exitCode(context.Background(), err) == exitNotTrusted:
		fmt.Fprintf(&b, "No balance: %s\n", stay.Text)
	default:
		return "", false
	}
	return b.String(), true
}

// wanted is the list of formats of a result folder.
func wanted(also []string) ([]string, error) {
	names := export.Standard()
	for _, n := range also {
		f, err := export.Lookup(n)
		if err != nil {
			return nil, err
		}
		names = appendNew(names, f.Name)
	}
	return names, nil
}

func appendNew(list []string, s string) []string {
	for _, l := range list {
		if l == s {
			return list
		}
	}
	return append(list, s)
}

func fileNames(formats []string) []string {
	var names []string
	for _, n := range formats {
		if f, err := export.Lookup(n); err == nil {
			names = append(names, f.File)
		}
	}
	return names
}

// writeTrace writes how the engines got there.
func writeTrace(path string, rec *engine.Recorder) error {
	return writeWhole(path, func(w io.Writer) error {
		if _, err := fmt.Fprintf(w, "# %s\nengine,stage,iteration,time [s],residual [-],energy [J]\n", canopy.Caution); err != nil {
			return err
		}
		for _, r := range rec.Rows {
			if _, err := fmt.Fprintf(w, "%s,%s,%d,%.6f,%.6e,%.9e\n", r.Engine, r.Stage, r.Iteration, r.Seconds, r.Residual, r.Energy); err != nil {
				return err
			}
		}
		return nil
	})
}

// writeWhole writes a file that appears complete or not at all.
func writeWhole(path string, write func(io.Writer) error) error {
	tmp, err := os.CreateTemp(filepath.Dir(path), "."+filepath.Base(path)+".*")
	if err != nil {
		return fmt.Errorf("writing %s: %w", path, err)
	}
	defer os.Remove(tmp.Name())
	if err := write(tmp); err != nil {
		tmp.Close()
		return fmt.Errorf("writing %s: %w", path, err)
	}
	if err := errors.Join(tmp.Chmod(0o644), tmp.Close()); err != nil {
		return fmt.Errorf("writing %s: %w", path, err)
	}
	return os.Rename(tmp.Name(), path)
}
