package export

import (
	"bufio"
	"cmp"
	"context"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"slices"
	"strings"
	"sync"

	"anticlast/formfind/canopy"
)

// ErrForeign is the reason why Folder refuses a folder that holds what this
// program did not write.
var ErrForeign = errors.New("not written by this program")

// marker is the file by which a result folder is known. Its lines after the
// first are the names of the files that belong to the folder.
const (
	marker     = ".anticlast"
	markerHead = "anticlast result folder; its files are replaced together by the next run"
)

// Folder writes r in the named formats into dir. The files appear together: they
// are written into a folder beside dir which then takes its place, so dir is
// never a mixture of two runs, and stays as it was when anything fails.
//
// A folder that holds files of others is refused with [ErrForeign] unless
// o.Force is set; it is then kept beside dir under another name.
func Folder(ctx context.Context, dir string, r *canopy.Result, names []string, o Options) error {
	var formats []Format
	for _, n := range names {
		f, err := Lookup(n)
		if err != nil {
			return err
		}
		if !slices.ContainsFunc(formats, func(g Format) bool { return g.Name == f.Name }) {
			formats = append(formats, f)
		}
	}
	return swapIn(dir, o, func(create func(name string, write func(io.Writer) error) error) error {
		// The files are written side by side; which error is told does not
		// depend on which comes first.
		ctx, stop := context.WithCancel(ctx)
		defer stop()
		errs := make([]error, len(formats))
		var all sync.WaitGroup
		places := make(chan struct{}, max(1, runtime.GOMAXPROCS(0)))
		for i, f := range formats {
			places <- struct{}{}
			all.Go(func() {
				defer func() { <-places }()
				errs[i] = create(f.File, func(w io.Writer) error { return f.Write(ctx, w, r, o) })
				if errs[i] != nil {
					stop()
				}
			})
		}
		all.Wait()
		var canceled error
		for _, err := range errs {
			if err != nil && !errors.Is(err, context.Canceled) {
				return err
			}
			canceled = cmp.Or(canceled, err)
		}
		return canceled
	})
}

// Explanation makes dir hold the file summary.txt with the given text and
// nothing else: what remains when no shape was found. A shape of an earlier run
// does not survive.
func Explanation(ctx context.Context, dir, text string, o Options) error {
	return swapIn(dir, o, func(create func(string, func(io.Writer) error) error) error {
		return create("summary.txt", func(w io.Writer) error {
			if err := ctx.Err(); err != nil {
				return err
			}
			if !strings.HasSuffix(text, "\n") {
				text += "\n"
			}
			_, err := io.WriteString(w, text+"\n"+canopy.Caution+"\n")
			return err
		})
	})
}

// File writes r in one format to the named file, which appears complete or not
// at all.
func File(ctx context.Context, name string, r *canopy.Result, f Format, o Options) (err error) {
	tmp, err := os.CreateTemp(filepath.Dir(name), "."+filepath.Base(name)+".*")
	if err != nil {
		return fmt.Errorf("writing %s: %w", name, err)
	}
	defer os.Remove(tmp.Name())
	if err := writeBuffered(tmp, func(w io.Writer) error { return f.Write(ctx, w, r, o) }); err != nil {
		return fmt.Errorf("writing %s: %w", name, err)
	}
	// Temporary files are private; a result is an ordinary file.
	if err := os.Chmod(tmp.Name(), ordinary(name)); err != nil {
		return fmt.Errorf("writing %s: %w", name, err)
	}
	if err := os.Rename(tmp.Name(), name); err != nil {
		return fmt.Errorf("writing %s: %w", name, err)
	}
	return nil
}

// ordinary is the mode of the file that is there, or that of a new file.
func ordinary(name string) fs.FileMode {
	if info, err := os.Stat(name); err == nil {
		return info.Mode().Perm()
	}
	return 0o644
}

// writeBuffered writes to f and closes it.
func writeBuffered(f *os.File, write func(io.Writer) error) error {
	b := bufio.NewWriterSize(f, 1<<16)
	err := write(b)
	if err == nil {
		err = b.Flush()
	}
	if cerr := f.Close(); err == nil {
		err = cerr
	}
	return err
}

// swapIn lets fill write the files of a new folder and puts it in the place of
// dir.
func swapIn(dir string, o Options, fill func(create func(name string, write func(io.Writer) error) error) error) error {
	fail := func(err error) error { return fmt.Errorf("result folder %s: %w", dir, err) }
	path, err := filepath.Abs(dir)
	if err != nil {
		return fail(err)
	}
	// The folder a link points to is replaced, not the link.
	if real, err := filepath.EvalSymlinks(path); err == nil {
		path = real
	}
	parent, base := filepath.Dir(path), filepath.Base(path)
	old := filepath.Join(parent, "."+base+".old")
	if err := recoverOld(path, old); err != nil {
		return fail(err)
	}
	foreign, err := inspect(path)
	if err != nil {
		return fail(err)
	}
	if foreign != "" && !o.Force {
		return fail(fmt.Errorf("it holds %s: %w", foreign, ErrForeign))
	}
	if err := os.MkdirAll(parent, 0o777); err != nil {
		return fail(err)
	}
	tmp, err := os.MkdirTemp(parent, "."+base+".new-")
	if err != nil {
		return fail(err)
	}
	defer os.RemoveAll(tmp) // nothing is left of it when all went well
	var names []string
	var lock sync.Mutex
	err = fill(func(name string, write func(io.Writer) error) error {
		f, err := os.Create(filepath.Join(tmp, name))
		if err != nil {
			return err
		}
		lock.Lock()
		names = append(names, name)
		lock.Unlock()
		if err := writeBuffered(f, write); err != nil {
			return fmt.Errorf("%s: %w", name, err)
		}
		return nil
	})
	if err != nil {
		return fail(err)
	}
	slices.Sort(names)
	list := markerHead + "\n" + strings.Join(names, "\n") + "\n"
	if err := os.WriteFile(filepath.Join(tmp, marker), []byte(list), 0o666); err != nil {
		return fail(err)
	}
	// Temporary folders are private.
	mode := fs.FileMode(0o755)
	info, err := os.Stat(path)
	there := err == nil
	if there {
		mode = info.Mode().Perm()
	}
	if err := os.Chmod(tmp, mode); err != nil {
		return fail(err)
	}
	if !there {
		if err := os.Rename(tmp, path); err != nil {
			return fail(err)
		}
		return nil
	}
	if err := os.Rename(path, old); err != nil {
		return fail(err)
	}
	if err := os.Rename(tmp, path); err != nil {
		return fail(errors.Join(err, os.Rename(old, path)))
	}
	if foreign == "" {
		return wrap(fail, os.RemoveAll(old))
	}
	// What others wrote is not ours to delete.
	for i := 1; ; i++ {
		kept := fmt.Sprintf("%s.before-%d", path, i)
		if _, err := os.Lstat(kept); errors.Is(err, fs.ErrNotExist) {
			return wrap(fail, os.Rename(old, kept))
		}
	}
}

func wrap(fail func(error) error, err error) error {
	if err == nil {
		return nil
	}
	return fail(err)
}

// recoverOld undoes what a run that was killed in the middle of the swap left.
func recoverOld(path, old string) error {
	if _, err := os.Lstat(old); err != nil {
		return nil
	}
	if _, err := os.Lstat(path); errors.Is(err, fs.ErrNotExist) {
		return os.Rename(old, path)
	}
	foreign, err := inspect(old)
	if err != nil {
		return err
	}
	if foreign != "" {
		return fmt.Errorf("%s stands in the way and holds %s: %w", old, foreign, ErrForeign)
	}
	return os.RemoveAll(old)
}

// inspect returns the name of something in the folder that this program did
// not write, "" when there is nothing or no folder.
func inspect(path string) (foreign string, err error) {
	info, err := os.Stat(path)
	if errors.Is(err, fs.ErrNotExist) {
		return "", nil
	}
	if err != nil {
		return "", err
	}
	if !info.IsDir() {
		return "", errors.New("there is a file of that name")
	}
	entries, err := os.ReadDir(path)
	if err != nil {
		return "", err
	}
	var ours []string
	if b, err := os.ReadFile(filepath.Join(path, marker)); err == nil {
		lines := strings.Split(strings.TrimSuffix(string(b), "\n"), "\n")
		if lines[0] == markerHead {
			ours = append(lines[1:], marker)
		}
	}
	ours = append(ours, ".DS_Store", "Thumbs.db", "desktop.ini") // left by file managers
	for _, e := range entries {
		if !slices.Contains(ours, e.Name()) {
			return e.Name(), nil
		}
	}
	return "", nil
}
