package main

import (
	"fmt"
	"io"

	"github.com/spf13/cobra"

	"anticlast/formfind/formfile"
	"anticlast/formfind/spec"
)

func (a *app) schemaCommand() *cobra.Command {
	return &cobra.Command{
		Use:   "schema model|form|keys",
		Short: "Print the JSON Schema of model files or of form.json, or the list of keys",
		Long: `Prints a JSON Schema: editors use that of the model file to complete and check
what is typed, programs that of form.json. keys prints every key of the model
file with its unit, default and meaning, as Markdown.`,
		Example: `  anticlast schema model > anticlast-model.schema.json
  anticlast schema keys`,
		Args:      args(1, 1, "model, form or keys"),
		ValidArgs: []string{"model", "form", "keys"},
		RunE: func(_ *cobra.Command, args []string) error {
			var text string
			switch args[0] {
			case "model":
				text = string(spec.Schema())
			case "form":
				text = string(formfile.Schema())
			case "keys":
				text = spec.Reference()
			default:
				return usageError{fmt.Errorf("there is no schema of %q; there are model, form and keys", args[0])}
			}
			_, err := io.WriteString(a.Out, text)
			return err
		},
	}
}
