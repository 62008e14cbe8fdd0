package spec_test

import (
	"context"
	"strings"
	"testing"

	"anticlast/formfind/canopy"
	"anticlast/formfind/spec"

	"github.com/stretchr/testify/require"
)

// read reads text and fails the test on any error or warning.
func read(t testing.TB, text string, set ...string) *canopy.Model {
	t.Helper()
	m, err := spec.Read(context.Background(), spec.Input(strings.NewReader(text), t.TempDir()), spec.Options{
		Set:  set,
		Warn: func(d spec.Diagnostic) { t.Errorf("warning: %v", d) },
	})
	require.NoError(t, err)
	return m
}

func TestSamplesReadWithoutErrorsOrWarnings(t *testing.T) {
	for _, s := range spec.Samples() {
		t.Run(s.Name, func(t *testing.T) {
			m := read(t, s.Text)
			require.NotEmpty(t, m.Title)
		})
	}
}
