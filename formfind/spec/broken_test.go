package spec_test

import (
	"context"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"anticlast/formfind/spec"

	"github.com/stretchr/testify/require"
)

// expectation is what one broken model must be told: the first lines of each
// file in testdata/broken at the top say
//
//	# expect: LINE:COLUMN part of the message … another part
//	# set: path=value
//
// one for every error. The place is FILE.csv:LINE:COLUMN for an error in a
// table, "set" for one in a set value, "?" for an error of the file as a whole.
type expectation struct {
	place string
	parts []string
}

func expectations(t *testing.T, path string) (want []expectation, sets []string) {
	t.Helper()
	b, err := os.ReadFile(path)
	require.NoError(t, err)
	for line := range strings.Lines(string(b)) {
		line = strings.TrimRight(line, "\n")
		if s, ok := strings.CutPrefix(line, "# set: "); ok {
			sets = append(sets, s)
			continue
		}
		s, ok := strings.CutPrefix(line, "# expect: ")
		if !ok {
			break
		}
		place, text, ok := strings.Cut(s, " ")
		require.True(t, ok, "%s: %q", path, line)
		want = append(want, expectation{place, strings.Split(text, " … ")})
	}
	require.NotEmpty(t, want, "%s has no line \"# expect: …\"", path)
	return want, sets
}

func TestBrokenModelsAreToldWhatIsWrongAndWhere(t *testing.T) {
	files, err := filepath.Glob("../../testdata/broken/*.yaml")
	require.NoError(t, err)
	require.Greater(t, len(files), 60)
	for _, path := range files {
		t.Run(strings.TrimSuffix(filepath.Base(path), ".yaml"), func(t *testing.T) {
			want, sets := expectations(t, path)
			m, err := spec.Read(context.Background(), spec.File(path), spec.Options{Set: sets})
			require.Nil(t, m)
			var all *spec.Errors
			require.True(t, errors.As(err, &all), "%v", err)
			require.Len(t, all.List, len(want), "%v", err)
			// Set errors come first, then the model file's, then the tables'.
			for i, w := range want {
				got := all.List[i].String()
				switch {
				case w.place == "set":
					require.True(t, strings.HasPrefix(got, "--set "+sets[0]+": "), "%s", got)
				case w.place == "?":
					require.True(t, strings.HasPrefix(got, path+":"), "%s", got)
				case strings.Contains(w.place, ".csv"):
					require.True(t, strings.HasPrefix(got, "../../testdata/broken/"+w.place+": "), "%s", got)
				default:
					require.True(t, strings.HasPrefix(got, path+":"+w.place+": "), "want %s, got %s", w.place, got)
				}
				for _, part := range w.parts {
					require.Contains(t, got, part)
				}
			}
		})
	}
}
