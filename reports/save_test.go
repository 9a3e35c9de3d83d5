package reports

import (
	"errors"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
)

func inside(t *testing.T, folder string) string {
	t.Helper()
	entries, err := os.ReadDir(folder)
	if err != nil {
		t.Fatal(err)
	}
	var out []string
	for _, e := range entries {
		out = append(out, e.Name())
	}
	return strings.Join(out, ",")
}

func content(t *testing.T, path string) string {
	t.Helper()
	data, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	return string(data)
}

func TestSaveMakesAndReplaces(t *testing.T) {
	folder := t.TempDir()
	path := filepath.Join(folder, "heron.xlsx")
	for _, text := range []string{"first", "the second, longer"} {
		if err := Save(path, []byte(text)); err != nil {
			t.Fatal(err)
		}
		if got := content(t, path); got != text || inside(t, folder) != "heron.xlsx" {
			t.Errorf("the file holds %q, the folder %s", got, inside(t, folder))
		}
	}
}

// TestSaveKeepsPermissionsAndLinks: the file behind a link is replaced, not the
// link, and stays as private as it was.
func TestSaveKeepsPermissionsAndLinks(t *testing.T) {
	folder := t.TempDir()
	path, link := filepath.Join(folder, "real.xlsx"), filepath.Join(folder, "link.xlsx")
	if err := os.WriteFile(path, []byte("old"), 0o600); err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink(path, link); err != nil {
		t.Skip("skipped: no symbolic links here: ", err)
	}
	if err := Save(link, []byte("new")); err != nil {
		t.Fatal(err)
	}
	info, err := os.Lstat(link)
	if err != nil || info.Mode()&os.ModeSymlink == 0 {
		t.Errorf("the link was replaced: %v, %v", info, err)
	}
	if info, err := os.Stat(path); err != nil || info.Mode().Perm() != 0o600 || content(t, path) != "new" {
		t.Errorf("the file behind the link: %v, %v", info.Mode(), err)
	}
}

// failing is a file on which one step fails.
type failing struct {
	*os.File
	step string
}

func (f failing) Write(p []byte) (int, error) {
	if f.step == "write" {
		n, _ := f.File.Write(p[:len(p)/2])
		return n, syscall.ENOSPC
	}
	return f.File.Write(p)
}

func (f failing) Sync() error {
	if f.step == "sync" {
		return syscall.EIO
	}
	return f.File.Sync()
}

func (f failing) Close() error {
	if err := f.File.Close(); f.step != "close" {
		return err
	}
	return syscall.EDQUOT
}

// TestSaveLeavesTheOldFileWhole fails every step in turn: the old file stays as
// it was and nothing is left beside it.
func TestSaveLeavesTheOldFileWhole(t *testing.T) {
	real := create
	t.Cleanup(func() { create = real })
	causes := map[string]error{"write": syscall.ENOSPC, "sync": syscall.EIO, "close": syscall.EDQUOT}
	for step, cause := range causes {
		folder := t.TempDir()
		path := filepath.Join(folder, "heron.xlsx")
		if err := os.WriteFile(path, []byte("the old report"), 0o644); err != nil {
			t.Fatal(err)
		}
		create = func(name string) (file, error) {
			f, err := real(name)
			if err != nil {
				return nil, err
			}
			return failing{f.(*os.File), step}, nil
		}
		err := Save(path, []byte("the new report"))
		if !errors.Is(err, cause) || !strings.Contains(err.Error(), "the old file is as it was") {
			t.Errorf("%s: error %v", step, err)
		}
		if got := content(t, path); got != "the old report" || inside(t, folder) != "heron.xlsx" {
			t.Errorf("%s: the file holds %q, the folder %s", step, got, inside(t, folder))
		}
	}
}

func TestSaveRefusesWhatIsNoFile(t *testing.T) {
	folder := t.TempDir()
	if err := Save(folder, []byte("x")); err == nil || !strings.Contains(err.Error(), "not a regular file") {
		t.Errorf("a folder: %v", err)
	}
	if err := Save(filepath.Join(folder, "none", "heron.xlsx"), []byte("x")); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("a folder that is not there: %v", err)
	}
	if inside(t, folder) != "" {
		t.Errorf("left behind: %s", inside(t, folder))
	}
}

// TestSaveBesideDebris: the temporary file of a run that was killed is in
// nobody's way.
func TestSaveBesideDebris(t *testing.T) {
	folder := t.TempDir()
	debris := filepath.Join(folder, ".heron.xlsx.part1")
	if err := os.WriteFile(debris, []byte("half"), 0o644); err != nil {
		t.Fatal(err)
	}
	if err := Save(filepath.Join(folder, "heron.xlsx"), []byte("whole")); err != nil {
		t.Fatal(err)
	}
	if content(t, debris) != "half" || inside(t, folder) != ".heron.xlsx.part1,heron.xlsx" {
		t.Errorf("the folder holds %s", inside(t, folder))
	}
}
