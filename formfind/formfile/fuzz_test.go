package formfile_test

import (
	"bytes"
	"context"
	"strings"
	"testing"

	"anticlast/formfind/formfile"

	"github.com/stretchr/testify/require"
)

// Whatever is read without an error must be writable and stable from then on.
func FuzzRead(f *testing.F) {
	good := string(write(f, small()))
	f.Add([]byte(good))
	f.Add([]byte(`{"format":"anticlast-form/1","nodes":[],"members":[],"triangles":[],"program":{},"model":{},"audit":{"trusted":true}}`))
	f.Add([]byte(strings.ReplaceAll(good, "null", "1e-320")))
	f.Add([]byte(strings.ReplaceAll(good, `":`, "\" :\n\t ")))
	f.Add([]byte("{\"\\ud83d\\ude00\\n\":[[],{},-0,1E+2,true]}"))
	f.Fuzz(func(t *testing.T, data []byte) {
		r, err := formfile.Read(context.Background(), bytes.NewReader(data), "form.json")
		if err != nil {
			require.NotEmpty(t, err.Error())
			return
		}
		var first, second bytes.Buffer
		if err := formfile.Write(context.Background(), &first, r); err != nil {
			// Lengths and areas of coordinates near the largest number overflow.
			require.Contains(t, err.Error(), "Inf")
			return
		}
		r, err = formfile.Read(context.Background(), bytes.NewReader(first.Bytes()), "form.json")
		require.NoError(t, err)
		require.NoError(t, formfile.Write(context.Background(), &second, r))
		require.Equal(t, first.String(), second.String())
	})
}
