package main

import "github.com/spf13/cobra"

// completeFiles has the shell complete file names with these extensions.
func completeFiles(ext ...string) func(*cobra.Command, []string, string) ([]string, cobra.ShellCompDirective) {
	return func(*cobra.Command, []string, string) ([]string, cobra.ShellCompDirective) {
		return ext, cobra.ShellCompDirectiveFilterFileExt
	}
}
