package formfile

import _ "embed"

//go:embed form.schema.json
var schema []byte

// Schema returns the JSON Schema (draft 2020-12) of form.json. The caller must
// not change it.
func Schema() []byte { return schema }
