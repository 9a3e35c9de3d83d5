package reports

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"strconv"
	"strings"
	"syscall"
)

// file is what Save needs of an open file; tests put one in its place that fails.
type file interface {
	Write(p []byte) (int, error)
	Sync() error
	Close() error
}

// The steps that tests make fail. create opens a file that must not exist yet.
var (
	create = func(name string) (file, error) {
		return os.OpenFile(name, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o666)
	}
	rename = os.Rename
)

// Save writes a whole file or leaves the old one as it was: the data goes to a
// temporary file in the same folder, reaches the disk, and takes the file's name
// in one step. A link is followed to the file it names, and the old file's
// permissions are kept. After an error no temporary file remains.
func Save(path string, data []byte) error {
	if real, err := filepath.EvalSymlinks(path); err == nil {
		path = real
	}
	mode := fs.FileMode(0)
	switch old, err := os.Stat(path); {
	case err == nil && !old.Mode().IsRegular():
		return fmt.Errorf("%s: is not a regular file; give the name of a file", path)
	case err == nil:
		mode = old.Mode().Perm()
	case !errors.Is(err, fs.ErrNotExist):
		return err
	}
	err := replace(path, data, mode)
	if errors.Is(err, errGone) {
		// Another run took the temporary file for what a killed one had left
		// (clearLeftovers), as when a clock jumped: once more.
		err = replace(path, data, mode)
	}
	if err != nil {
		return notWritten(path, mode != 0, err)
	}
	return syncFolder(filepath.Dir(path))
}

// errGone is wrapped by the error of a temporary file that somebody took away.
var errGone = errors.New("the temporary file is gone")

// replace fills a temporary file and gives it the name of path. A mode of 0 is
// that of a new file.
func replace(path string, data []byte, mode fs.FileMode) error {
	temporary, f, err := beside(path)
	if err != nil {
		return err
	}
	err = fill(f, data)
	if err == nil && mode != 0 {
		err = os.Chmod(temporary, mode)
	}
	if err == nil {
		err = rename(temporary, path)
	}
	if err == nil {
		return nil
	}
	if _, there := os.Lstat(temporary); errors.Is(there, fs.ErrNotExist) && errors.Is(err, fs.ErrNotExist) {
		return fmt.Errorf("%w: %w", errGone, err)
	}
	os.Remove(temporary)
	return err
}

// notWritten is the error of a save that failed: the cause alone, without the
// temporary file's name, and what is left.
func notWritten(path string, old bool, err error) error {
	var p *fs.PathError
	var l *os.LinkError
	switch {
	case errors.As(err, &p):
		err = p.Err
	case errors.As(err, &l):
		err = l.Err
	}
	if old {
		return fmt.Errorf("%s: not written, the old file is as it was: %w", path, err)
	}
	return fmt.Errorf("%s: nothing was written: %w", path, err)
}

// beside makes a new hidden file in the folder of path; several programs may do
// so at once.
func beside(path string) (string, file, error) {
	for n := 1; ; n++ {
		name := temporaryName(path, strconv.Itoa(n))
		f, err := create(name)
		if err == nil {
			return name, f, nil
		}
		if !errors.Is(err, fs.ErrExist) || n == 1000 {
			return "", nil, err
		}
	}
}

// longestBase keeps a temporary name within what file systems take: 255 bytes.
const longestBase = 200

// temporaryName is the name of the n-th temporary file of path.
func temporaryName(path, n string) string {
	folder, base := filepath.Split(path)
	if len(base) > longestBase {
		base = strings.ToValidUTF8(base[:longestBase], "")
	}
	return folder + "." + base + ".part" + n
}

func fill(f file, data []byte) error {
	n, err := f.Write(data)
	if err == nil && n < len(data) {
		err = io.ErrShortWrite
	}
	if err == nil {
		err = f.Sync()
	}
	if closed := f.Close(); err == nil {
		err = closed
	}
	return err
}

// syncFolder brings the new name to the disk. Systems that cannot sync a folder
// say so, and then the rename is all that can be done.
func syncFolder(folder string) error {
	if runtime.GOOS == "windows" {
		return nil
	}
	d, err := os.Open(folder)
	if err != nil {
		if errors.Is(err, fs.ErrPermission) {
			return nil // a folder may be writable and not readable
		}
		return err
	}
	defer d.Close()
	if err := d.Sync(); err != nil && !errors.Is(err, syscall.EINVAL) && !errors.Is(err, errors.ErrUnsupported) {
		return fmt.Errorf("%s: the report is written, but the folder could not be synced: %w", folder, err)
	}
	return nil
}
