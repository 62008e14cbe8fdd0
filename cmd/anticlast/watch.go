package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"time"

	"anticlast/formfind"
)

// watchInterval is how often the model file is looked at. Asking for its time
// works on every file system and with every editor's way of saving.
const watchInterval = 150 * time.Millisecond

// watch forms the model now and after every change of its file, or of a table or
// drawing beside it, until ctx is done. Faults of a run are said and the watch goes on.
func (a *app) watch(ctx context.Context, path string, f formFlags) error {
	if path == "-" {
		return usageError{errors.New("standard input cannot be watched; name a model file")}
	}
	if _, err := os.Stat(path); err != nil {
		_, err := a.readModel(ctx, path, f.set)
		return err
	}
	f.watch = false
	var last stamp
	for {
		now := stampOf(path)
		if now != last && now != (stamp{}) || changed(a.beside) {
			last = now
			start := time.Now()
			err := a.form(ctx, path, f)
			if ctx.Err() != nil {
				return nil
			}
			code := a.exit(ctx, err)
			if !a.quiet && !a.json {
				said := fmt.Sprintf("formed in %d ms", time.Since(start).Milliseconds())
				var none *formfind.NoEquilibriumError
				if code != exitFine && code != exitNotTrusted || errors.As(err, &none) {
					said = "not formed"
				}
				fmt.Fprintf(a.Err, "%s; watching %s, Ctrl-C ends\n", said, path)
			}
			continue
		}
		select {
		case <-ctx.Done():
			return nil // the wanted end of a watch is an interruption
		case <-time.After(watchInterval):
		}
	}
}

type stamp struct {
	changed time.Time
	size    int64
}

// stampOf returns the zero stamp while an editor has the file away.
func stampOf(path string) stamp {
	info, err := os.Stat(path)
	if err != nil {
		return stamp{}
	}
	return stamp{info.ModTime(), info.Size()}
}

// besideFile is a table or drawing and how it was when it was read.
type besideFile struct {
	path string
	was  stamp
}

// changed reports whether a file is there and is not as it was.
func changed(files []besideFile) bool {
	for _, f := range files {
		if now := stampOf(f.path); now != f.was && now != (stamp{}) {
			return true
		}
	}
	return false
}
