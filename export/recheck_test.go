package export

import (
	"bytes"
	"fmt"
	"testing"

	"anticlast/formfind"
	"anticlast/formfind/formfile"

	"github.com/santhosh-tekuri/jsonschema/v6"
	"github.com/stretchr/testify/require"
)

// after reading, every number is the same to the last bit.
func TestAuditOfAWrittenFormIsTheSame(t *testing.T) {
	schema := formSchema(t)
	for _, name := range []string{"four-point-sail", "seven-point-sail", "cone", "cable-net", "arch-vault", "ridge-and-valley"} {
		r := found(t, name)
		var b bytes.Buffer
		require.NoError(t, formfile.Write(background, &b, r))
		v, err := jsonschema.UnmarshalJSON(bytes.NewReader(b.Bytes()))
		require.NoError(t, err)
		require.NoError(t, schema.Validate(v), name)
		back, err := formfile.Read(background, &b, "form.json")
		require.NoError(t, err)
		require.NoError(t, formfind.Judge(background, back))
		// Found by the front door from two meshes, not by the audit.
		back.Audit.Discretisation = r.Audit.Discretisation
		require.Equal(t, fmt.Sprintf("%+v", r.Audit), fmt.Sprintf("%+v", back.Audit), name)
		require.Equal(t, fmt.Sprintf("%+v", r.Summary), fmt.Sprintf("%+v", back.Summary), name)
		require.Equal(t, fmt.Sprintf("%+v", r.Findings), fmt.Sprintf("%+v", back.Findings), name)
	}
}

func formSchema(t *testing.T) *jsonschema.Schema {
	t.Helper()
	doc, err := jsonschema.UnmarshalJSON(bytes.NewReader(formfile.Schema()))
	require.NoError(t, err)
	c := jsonschema.NewCompiler()
	require.NoError(t, c.AddResource("form.schema.json", doc))
	s, err := c.Compile("form.schema.json")
	require.NoError(t, err)
	return s
}
