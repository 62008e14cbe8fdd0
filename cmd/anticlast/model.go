package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"

	"anticlast/formfind/canopy"
	"anticlast/formfind/formfile"
	"anticlast/formfind/spec"
)

// readModel reads a model file, or standard input for "-". Warnings go to the
// error stream.
func (a *app) readModel(ctx context.Context, path string, set []string) (*canopy.Model, error) {
	src := spec.File(path)
	if path == "-" {
		src = spec.Input(a.In, ".")
	} else if info, err := os.Stat(path); err == nil && info.IsDir() {
		return nil, usageError{fmt.Errorf("%s is a folder; name the model file in it", path)}
	}
	a.beside = nil
	m, err := spec.Read(ctx, src, spec.Options{Set: set, Beside: func(p string) { a.beside = append(a.beside, besideFile{p, stampOf(p)}) }, Warn: func(d spec.Diagnostic) {
		if !a.quiet {
			fmt.Fprintf(a.Err, "anticlast: warning: %s\n", d)
		}
	}})
	if err != nil {
		var said *spec.Errors
		if errors.As(err, &said) {
			return nil, err
		}
		if errors.Is(err, os.ErrNotExist) {
			return nil, inputError{path, fmt.Errorf("%s: there is no such file; anticlast sample prints a model to start from", path)}
		}
		return nil, err
	}
	if m.Listed != nil {
		collectEagerly(len(m.Listed.Position))
	}
	return m, nil
}

// readForm reads a form.json, or standard input for "-". A folder stands for
// the form.json in it.
func (a *app) readForm(ctx context.Context, path string) (*canopy.Result, error) {
	if path == "-" {
		return formfile.Read(ctx, a.In, "-")
	}
	if info, err := os.Stat(path); err == nil && info.IsDir() {
		path = filepath.Join(path, "form.json")
	}
	f, err := os.Open(path)
	if err != nil {
		if errors.Is(err, os.ErrNotExist) {
			return nil, inputError{path, fmt.Errorf("%s: there is no such file; anticlast form MODEL writes one", path)}
		}
		return nil, err
	}
	defer f.Close()
	return formfile.Read(ctx, f, path)
}

// resultFolder is where form writes when no folder is named: beside the model.
func resultFolder(model string) string {
	base := filepath.Base(model)
	if ext := filepath.Ext(base); ext != "" {
		base = strings.TrimSuffix(base, ext)
	}
	return filepath.Join(filepath.Dir(model), base+"-form")
}
