package spec

import (
	"flag"
	"os"
	"testing"

	"github.com/stretchr/testify/require"
)

var update = flag.Bool("update", false, "write generated files anew")

func TestSchemaFileIsFresh(t *testing.T) {
	want, err := makeSchema()
	require.NoError(t, err)
	if *update {
		require.NoError(t, os.WriteFile("model.schema.json", want, 0o644))
		return
	}
	require.Equal(t, string(want), string(Schema()), "run: go test ./formfind/spec -run TestSchemaFileIsFresh -update")
}
