package reports

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
)

// CheckTarget makes sure, before a long run, that a report of the title given
// can be written to path when it ends: the folder takes new files, and a file
// that is there is this program's own report of the same case, or force is set.
// It leaves nothing behind.
func CheckTarget(path, title string, force bool) error {
	ours, same, err := Owned(path, title)
	switch {
	case errors.Is(err, fs.ErrNotExist):
	case err != nil && !force:
		return fmt.Errorf("%s cannot be read to see whose it is (%v); use --force to replace it, or --out for another name", path, err)
	case !force && !ours:
		return fmt.Errorf("%s exists and is not a report of this program as it wrote it; use --force to replace it, or --out for another name", path)
	case !force && !same:
		return fmt.Errorf("%s is the report of another case; use --force to replace it, or --out for another name", path)
	}
	return CheckFolder(filepath.Dir(path))
}

// CheckFolder makes sure that files can be made in a folder.
func CheckFolder(dir string) error {
	f, err := os.CreateTemp(dir, ".ebbline-*")
	if err != nil {
		return fmt.Errorf("no file can be written into the folder %s (%v); use --out for another place", dir, reason(err))
	}
	f.Close()
	return os.Remove(f.Name())
}

// reason is the cause of a path error without the path.
func reason(err error) error {
	var p *fs.PathError
	if errors.As(err, &p) {
		return p.Err
	}
	return err
}
