package reports

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
	"time"
)

// CheckTarget makes sure, before a long run, that a report of the title given
// can be written to path when it ends: the folder takes new files, and a file
// that is there is this program's own report of the same case, or force is set.
// It leaves nothing behind, and clears away what a run that was killed while it
// wrote left beside the file an hour ago or longer.
func CheckTarget(path, title string, force bool) error {
	ours, same, err := Owned(path, title)
	switch {
	case errors.Is(err, fs.ErrNotExist):
	case errors.Is(err, syscall.ENAMETOOLONG):
		return fmt.Errorf("%s cannot be the name of a file (%v); give a shorter one", path, reason(err))
	case err != nil && !force:
		return fmt.Errorf("%s cannot be read to see whose it is (%v); use --force to replace it, or --out for another name", path, err)
	case !force && !ours:
		return fmt.Errorf("%s exists and is not a report of this program as it wrote it; use --force to replace it, or --out for another name", path)
	case !force && !same:
		return fmt.Errorf("%s is the report of another case; use --force to replace it, or --out for another name", path)
	}
	clearLeftovers(path)
	return CheckFolder(filepath.Dir(path))
}

// clearLeftovers removes temporary files of path that no run can still be
// writing. What cannot be removed is left: it does no harm. Where a clock has
// jumped, a file that is being written may go too: Save then writes it again.
func clearLeftovers(path string) {
	dir, start := filepath.Split(temporaryName(path, ""))
	if dir == "" {
		dir = "."
	}
	entries, err := os.ReadDir(dir)
	if err != nil {
		return
	}
	for _, e := range entries {
		n, ours := strings.CutPrefix(e.Name(), start)
		if _, err := strconv.Atoi(n); !ours || err != nil {
			continue
		}
		part := filepath.Join(dir, e.Name())
		if info, err := os.Lstat(part); err == nil && info.Mode().IsRegular() && time.Since(info.ModTime()) > time.Hour {
			os.Remove(part)
		}
	}
}

// CheckFolder makes sure that files can be made in a folder.
func CheckFolder(dir string) error {
	f, err := os.CreateTemp(dir, ".ebbline-*")
	if err != nil {
		return fmt.Errorf("no file can be written into the folder %s (%v); give another place", dir, reason(err))
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
