package main

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"anticlast/export"
	"anticlast/formfind/canopy"
)

type exportFlags struct {
	to    []string
	out   string
	list  bool
	force bool
	// how a format is written
	ground bool
	width  int
}

func (a *app) exportCommand() *cobra.Command {
	var f exportFlags
	c := &cobra.Command{
		Use:   "export FORM",
		Short: "Write a form.json in other formats, without solving again",
		Long: `Writes a result in other formats. FORM is a form.json, the folder it is in, or -
for standard input.

One format goes to the file -o names, to standard output for -o -, or beside the
form.json. Several formats go into the folder that -o names. An analysis hand-over
is a folder of tables with a text that explains them, or a .zip of it.

` + canopy.Caution,
		Example: `  anticlast export --list
  anticlast export sail-form --to glb -o sail.glb
  anticlast export sail-form/form.json --to reactions -o -
  anticlast export sail-form --to handover -o for-the-engineer
  anticlast export sail-form --to glb,members,summary -o for-the-client`,
		Args: func(cmd *cobra.Command, list []string) error {
			if f.list {
				return args(0, 0, "no argument with --list")(cmd, list)
			}
			return args(1, 1, "one form.json")(cmd, list)
		},
		RunE: func(cmd *cobra.Command, args []string) error {
			if f.list {
				return a.listFormats()
			}
			return a.export(cmd.Context(), args[0], f)
		},
		ValidArgsFunction: completeFiles("json"),
	}
	fl := c.Flags()
	fl.StringSliceVar(&f.to, "to", nil, "formats, by name or extension (see --list)")
	fl.StringVarP(&f.out, "out", "o", "", "file, folder, or - for standard output")
	fl.BoolVar(&f.list, "list", false, "list the formats and what each is for")
	fl.BoolVar(&f.force, "force", false, "replace a folder this program did not write (it is kept under another name)")
	fl.BoolVar(&f.ground, "ground", false, "GLB: add a ground plane and a levelling staff banded in metres")
	fl.IntVar(&f.width, "picture-width", 0, "PNG: `PIXELS` across (default 1600)")
	_ = c.RegisterFlagCompletionFunc("to", func(*cobra.Command, []string, string) ([]string, cobra.ShellCompDirective) {
		var names []string
		for _, f := range export.Formats() {
			names = append(names, f.Name+"\t"+f.Purpose)
		}
		return names, cobra.ShellCompDirectiveNoFileComp
	})
	return c
}

func (a *app) listFormats() error {
	if a.json {
		type row struct {
			Name    string `json:"name"`
			File    string `json:"file"`
			Purpose string `json:"purpose"`
		}
		var rows []row
		for _, f := range export.Formats() {
			rows = append(rows, row{f.Name, f.File, f.Purpose})
		}
		e := json.NewEncoder(a.Out)
		e.SetIndent("", "  ")
		return e.Encode(rows)
	}
	for _, f := range export.Formats() {
		fmt.Fprintf(a.Out, "%-10s %-14s %s\n", f.Name, f.File, f.Purpose)
	}
	return nil
}

func (a *app) export(ctx context.Context, path string, f exportFlags) error {
	if len(f.to) == 0 {
		return usageError{errors.New("say which format with --to; anticlast export --list shows them")}
	}
	var formats []export.Format
	var names []string
	for _, n := range f.to {
		format, err := export.Lookup(n)
		if err != nil {
			return usageError{err}
		}
		formats = append(formats, format)
		names = append(names, format.Name)
	}
	if len(formats) > 1 && f.out == "-" {
		return usageError{errors.New("standard output takes one format; name a folder with -o")}
	}
	if len(formats) > 1 && f.out == "" {
		return usageError{errors.New("several formats need a folder: name one with -o")}
	}
	r, err := a.readForm(ctx, path)
	if err != nil {
		return err
	}
	if f.width < 0 || f.width > 20000 {
		return usageError{fmt.Errorf("a picture %d pixels across cannot be made; give 100 to 20000", f.width)}
	}
	o := export.Options{Force: f.force, Ground: f.ground, PictureWidth: f.width}
	var wrote []string
	switch {
	case len(formats) > 1:
		if err := export.Folder(ctx, f.out, r, names, o); err != nil {
			return foreign(err)
		}
		for _, format := range formats {
			wrote = append(wrote, filepath.Join(f.out, format.File))
		}
	case f.out == "-" || f.out == "" && path == "-":
		return formats[0].Write(ctx, a.Out, r, o)
	case formats[0].Name == "handover" && handoverFolder(f.out):
		if err := export.Handover(ctx, f.out, r, o); err != nil {
			return foreign(err)
		}
		wrote = append(wrote, f.out)
	default:
		name := f.out
		if name == "" {
			folder := filepath.Dir(path)
			if isFolder(path) {
				folder = path
			}
			name = filepath.Join(folder, formats[0].File)
		} else if isFolder(name) {
			name = filepath.Join(name, formats[0].File)
		}
		if err := export.File(ctx, name, r, formats[0], o); err != nil {
			return err
		}
		wrote = append(wrote, name)
	}
	if a.json {
		e := json.NewEncoder(a.Out)
		e.SetIndent("", "  ")
		return e.Encode(map[string]any{"caution": canopy.Caution, "trusted": r.Audit.Trusted, "files": wrote})
	}
	if !a.quiet {
		fmt.Fprintf(a.Out, "Written: %s\n", strings.Join(wrote, ", "))
		if !r.Audit.Trusted {
			fmt.Fprintln(a.Out, "The result is NOT TRUSTED; anticlast check says why.")
		}
		fmt.Fprintln(a.Out, canopy.Caution)
	}
	return nil
}

// foreign tells what to do about somebody else's folder.
func foreign(err error) error {
	if errors.Is(err, export.ErrForeign) {
		return usageError{fmt.Errorf("%w; name another folder with -o, or add --force to move it aside", err)}
	}
	return err
}

// handoverFolder reports whether a hand-over goes to out as a folder of tables:
// not when out says it is an archive, nor when it is a result folder, which is
// not to be replaced and gets the archive.
func handoverFolder(out string) bool {
	if out == "" || out == "-" || strings.EqualFold(filepath.Ext(out), ".zip") {
		return false
	}
	_, err := os.Stat(filepath.Join(out, "form.json"))
	return err != nil
}

func isFolder(path string) bool {
	info, err := os.Stat(path)
	return err == nil && info.IsDir()
}
