package main

import (
	"bytes"
	"encoding/json"
	"io"

	"anticlast/formfind/canopy"
	"anticlast/formfind/formfile"
)

// writeHead prints what --json promises: the head of form.json, without the
// long lists, and what the command adds.
func writeHead(w io.Writer, r *canopy.Result, more map[string]any) error {
	b, err := formfile.AppendHead([]byte("{\n"), r)
	if err != nil {
		return err
	}
	if len(more) > 0 {
		extra, err := json.Marshal(more)
		if err != nil {
			return err
		}
		b = append(b, ",\n"...)
		b = append(b, bytes.Trim(extra, "{}")...)
	}
	b = append(b, "\n}\n"...)
	_, err = w.Write(b)
	return err
}
