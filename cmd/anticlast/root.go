package main

import (
	"context"
	"fmt"
	"os"
	"runtime/debug"

	"github.com/spf13/cobra"

	"anticlast/formfind/canopy"
)

// app is what all commands share.
type app struct {
	Streams
	json  bool
	quiet bool
	// beside are the tables and drawings of the model read last.
	beside []besideFile
}

// Run runs the command line and returns the exit code: the one place where an
// error becomes a number and a message.
func Run(ctx context.Context, args []string, s Streams) (code int) {
	defer func() {
		if p := recover(); p != nil {
			fmt.Fprintf(s.Err, "anticlast: internal fault: %v\nNothing of this run should be used. Please report it with the model file.\n", p)
			if os.Getenv("ANTICLAST_DEBUG") != "" {
				s.Err.Write(debug.Stack())
			}
			code = exitFailed
		}
	}()
	a := &app{Streams: s}
	root := a.root()
	root.SetArgs(args)
	root.SetIn(s.In)
	root.SetOut(s.Out)
	root.SetErr(s.Err)
	err := root.ExecuteContext(ctx)
	return a.exit(ctx, err)
}

func (a *app) root() *cobra.Command {
	root := &cobra.Command{
		Use:   "anticlast",
		Short: "Find the shape a canopy can take",
		Long: `Anticlast finds the equilibrium shape of a prestressed canopy of fabric or
cables from a boundary and a prestress, proves that it balances, and writes it
for viewers, tables and detailed analysis.

  anticlast sample sail -o sail.yaml    a starter model to change
  anticlast form sail.yaml              find the shape and write everything
  anticlast check sail-form/form.json   audit it again, from the file alone

Exit codes: 0 fine; 1 failed; 2 bad input; 3 found, but the audit or a limit is
not met, or shown to have no equilibrium; 130 interrupted.

` + canopy.Caution,
		SilenceUsage:  true,
		SilenceErrors: true,
		Args: func(cmd *cobra.Command, args []string) error {
			if len(args) > 0 {
				return usageError{fmt.Errorf("unknown command %q%s", args[0], suggestion(cmd, args[0]))}
			}
			return nil
		},
		RunE: func(cmd *cobra.Command, _ []string) error { return cmd.Help() },
	}
	root.PersistentFlags().BoolVar(&a.json, "json", false, "print one JSON object instead of text")
	root.PersistentFlags().BoolVarP(&a.quiet, "quiet", "q", false, "print nothing but errors")
	root.SetFlagErrorFunc(func(cmd *cobra.Command, err error) error {
		return usageError{fmt.Errorf("%w; see %s --help", err, cmd.CommandPath())}
	})
	root.SuggestionsMinimumDistance = 2
	root.CompletionOptions.HiddenDefaultCmd = false
	root.AddCommand(a.formCommand(), a.meshCommand(), a.checkCommand(), a.exportCommand(), a.compareCommand(), a.sampleCommand(), a.schemaCommand(), a.versionCommand())
	return root
}

func suggestion(cmd *cobra.Command, name string) string {
	near := cmd.SuggestionsFor(name)
	if len(near) == 0 {
		return "; see anticlast --help"
	}
	return fmt.Sprintf("; did you mean %q?", near[0])
}

// args checks the number of arguments with a message that says what is missing.
func args(min, max int, what string) cobra.PositionalArgs {
	return func(cmd *cobra.Command, args []string) error {
		switch {
		case len(args) < min:
			return usageError{fmt.Errorf("%s needs %s; see %s --help", cmd.CommandPath(), what, cmd.CommandPath())}
		case len(args) > max:
			return usageError{fmt.Errorf("%s takes %s, but there is also %q", cmd.CommandPath(), what, args[max])}
		}
		return nil
	}
}
