package main

import (
	"encoding/json"
	"fmt"
	"runtime"

	"github.com/spf13/cobra"

	"anticlast/formfind/formfile"
	"anticlast/formfind/spec"
)

// version of the program, written into every result.
const version = "0.1.0"

func (a *app) versionCommand() *cobra.Command {
	return &cobra.Command{
		Use:     "version",
		Short:   "Print the version of the program and of its file formats",
		Example: "  anticlast version --json",
		Args:    args(0, 0, "no argument"),
		RunE: func(*cobra.Command, []string) error {
			v := struct {
				Program string `json:"program"`
				Version string `json:"version"`
				Model   string `json:"model_format"`
				Form    string `json:"form_format"`
				Go      string `json:"go"`
				System  string `json:"system"`
			}{"anticlast", version, fmt.Sprint(spec.FormatVersion), formfile.Format, runtime.Version(), runtime.GOOS + "/" + runtime.GOARCH}
			if a.json {
				e := json.NewEncoder(a.Out)
				e.SetIndent("", "  ")
				return e.Encode(v)
			}
			fmt.Fprintf(a.Out, "anticlast %s\nmodel format %s, result format %s\n%s, %s\n", v.Version, v.Model, v.Form, v.Go, v.System)
			return nil
		},
	}
}
