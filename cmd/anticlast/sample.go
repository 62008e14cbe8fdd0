package main

import (
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"

	"github.com/spf13/cobra"

	"anticlast/formfind/spec"
)

func (a *app) sampleCommand() *cobra.Command {
	var out string
	var force bool
	c := &cobra.Command{
		Use:   "sample [KIND]",
		Short: "Print a commented starter model",
		Long: `Prints a commented model to start from, or writes it with -o. Without a kind it
lists the kinds there are.`,
		Example: `  anticlast sample
  anticlast sample sail -o sail.yaml
  anticlast sample cone | anticlast form -`,
		Args: args(0, 1, "one kind of sample"),
		RunE: func(_ *cobra.Command, args []string) error {
			if len(args) == 0 {
				return a.listSamples()
			}
			return a.sample(args[0], out, force)
		},
		ValidArgsFunction: func(*cobra.Command, []string, string) ([]string, cobra.ShellCompDirective) {
			var names []string
			for _, s := range spec.Samples() {
				names = append(names, s.Name+"\t"+s.Purpose)
			}
			return names, cobra.ShellCompDirectiveNoFileComp
		},
	}
	c.Flags().StringVarP(&out, "out", "o", "", "file to write; - or nothing for standard output")
	c.Flags().BoolVar(&force, "force", false, "replace the file if it exists")
	return c
}

func (a *app) listSamples() error {
	if a.json {
		type row struct {
			Name    string `json:"name"`
			Purpose string `json:"purpose"`
		}
		var rows []row
		for _, s := range spec.Samples() {
			rows = append(rows, row{s.Name, s.Purpose})
		}
		e := json.NewEncoder(a.Out)
		e.SetIndent("", "  ")
		return e.Encode(rows)
	}
	for _, s := range spec.Samples() {
		fmt.Fprintf(a.Out, "%-10s %s\n", s.Name, s.Purpose)
	}
	fmt.Fprintln(a.Out, "\nanticlast sample KIND -o model.yaml writes one.")
	return nil
}

func (a *app) sample(kind, out string, force bool) error {
	for _, s := range spec.Samples() {
		if s.Name != kind {
			continue
		}
		if out == "" || out == "-" {
			_, err := io.WriteString(a.Out, s.Text)
			return err
		}
		if _, err := os.Stat(out); err == nil && !force {
			return usageError{fmt.Errorf("%s exists; name another file, or add --force to replace it", out)}
		} else if err != nil && !errors.Is(err, os.ErrNotExist) {
			return err
		}
		err := writeWhole(out, func(w io.Writer) error {
			_, err := io.WriteString(w, s.Text)
			return err
		})
		if err == nil && !a.quiet {
			fmt.Fprintf(a.Out, "Written to %s. Next: anticlast form %s\n", out, out)
		}
		return err
	}
	var names []string
	for _, s := range spec.Samples() {
		names = append(names, s.Name)
	}
	return usageError{fmt.Errorf("there is no sample %q; there are %v", kind, names)}
}
