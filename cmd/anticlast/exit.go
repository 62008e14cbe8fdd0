package main

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"strings"

	"anticlast/export"
	"anticlast/formfind"
	"anticlast/formfind/formfile"
	"anticlast/formfind/mesh"
	"anticlast/formfind/spec"
)

// Exit codes of every command.
const (
	exitFine        = 0
	exitFailed      = 1
	exitBadInput    = 2
	exitNotTrusted  = 3 // found, but audit or a limit not met; or no equilibrium
	exitInterrupted = 130
)

// errNotTrusted ends a command whose result was printed and written but is not
// to be relied on. It carries no further message.
var errNotTrusted = errors.New("not trusted")

// usageError is a wrong way to call the command.
type usageError struct{ error }

func (e usageError) Unwrap() error { return e.error }

// inputError is a fault of a file that was read, already said in full.
type inputError struct {
	file string
	error
}

func (e inputError) Unwrap() error { return e.error }

// modelError is an error met while working on a model file; what kind it is
// says the error inside.
type modelError struct {
	file string
	error
}

func (e modelError) Unwrap() error { return e.error }

func exitCode(ctx context.Context, err error) int {
	var (
		usage   usageError
		input   inputError
		model   *spec.Errors
		built   mesh.Errors
		syntax  *formfile.SyntaxError
		none    *formfind.NoEquilibriumError
		stay    *formfind.BalanceError
		support *formfind.SupportError
	)
	switch {
	case err == nil:
		return exitFine
	case ctx.Err() != nil && errors.Is(err, context.Canceled):
		return exitInterrupted
	case errors.Is(err, errNotTrusted), errors.As(err, &none):
		return exitNotTrusted
	case errors.As(err, &stay):
		if stay.Fault == formfind.BalanceSurplus || stay.Fault == formfind.BalanceMoving {
			return exitBadInput
		}
		return exitNotTrusted
	case errors.As(err, &usage), errors.As(err, &input), errors.As(err, &model), errors.As(err, &built),
		errors.As(err, &syntax), errors.As(err, &support), errors.Is(err, formfind.ErrEmpty),
		errors.Is(err, fs.ErrNotExist), errors.Is(err, export.ErrForeign):
		return exitBadInput
	}
	return exitFailed
}

// exit says what went wrong and returns the exit code.
func (a *app) exit(ctx context.Context, err error) int {
	code := exitCode(ctx, err)
	if err == nil || errors.Is(err, errNotTrusted) {
		return code
	}
	text := message(err)
	if code == exitInterrupted {
		text = "interrupted; nothing was written"
	}
	if a.json {
		var lines []string
		for l := range strings.Lines(text) {
			lines = append(lines, strings.TrimSuffix(l, "\n"))
		}
		out, _ := json.MarshalIndent(map[string]any{"exit": code, "errors": lines}, "", "  ")
		fmt.Fprintf(a.Out, "%s\n", out)
	}
	for l := range strings.Lines(text) {
		fmt.Fprintf(a.Err, "anticlast: %s\n", strings.TrimSuffix(l, "\n"))
	}
	return code
}

// message puts the file's name before what the mesher says of its lines.
func message(err error) string {
	var input modelError
	var built mesh.Errors
	if errors.As(err, &input) && errors.As(err, &built) {
		var lines []string
		for _, e := range built {
			if e.Line > 0 {
				at := *e
				at.Line = 0
				lines = append(lines, fmt.Sprintf("%s:%d: %s", input.file, e.Line, at.Error()))
			} else {
				lines = append(lines, fmt.Sprintf("%s: %s", input.file, e.Error()))
			}
		}
		return strings.Join(lines, "\n")
	}
	return err.Error()
}
