package reports

import (
	"errors"
	"io"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"syscall"
	"testing"
	"time"
)

// faulty is a file on which one step goes wrong in one way.
type faulty struct {
	*os.File
	step string
}

func (f faulty) Write(p []byte) (int, error) {
	switch f.step {
	case "full disk":
		n, _ := f.File.Write(p[:len(p)/2])
		return n, &os.PathError{Op: "write", Path: f.Name(), Err: syscall.ENOSPC}
	case "short write":
		return f.File.Write(p[:len(p)-1])
	case "nothing written":
		return 0, nil
	}
	return f.File.Write(p)
}

func (f faulty) Sync() error {
	if f.step == "sync" {
		return syscall.EIO
	}
	return f.File.Sync()
}

func (f faulty) Close() error {
	if err := f.File.Close(); f.step != "close" {
		return err
	}
	return syscall.EDQUOT
}

// TestSaveUnderEveryFault: whatever step fails, with an old file and without one,
// the old file is whole, nothing is left beside it, the message says what is kept
// and gives the cause, and the next save works.
func TestSaveUnderEveryFault(t *testing.T) {
	realCreate, realRename := create, rename
	t.Cleanup(func() { create, rename = realCreate, realRename })
	causes := map[string]error{"full disk": syscall.ENOSPC, "short write": io.ErrShortWrite, "nothing written": io.ErrShortWrite, "sync": syscall.EIO,
		"close": syscall.EDQUOT, "create": syscall.EACCES, "read-only": syscall.EROFS, "rename": syscall.EXDEV}
	const old, fresh = "the old report", "the new report, which is longer"
	for step, cause := range causes {
		for _, had := range []bool{true, false} {
			dir := t.TempDir()
			path := filepath.Join(dir, "heron.xlsx")
			if had {
				if err := os.WriteFile(path, []byte(old), 0o640); err != nil {
					t.Fatal(err)
				}
			}
			create = func(name string) (file, error) {
				if step == "create" || step == "read-only" {
					return nil, &os.PathError{Op: "open", Path: name, Err: cause.(syscall.Errno)}
				}
				f, err := realCreate(name)
				if err != nil {
					return nil, err
				}
				return faulty{f.(*os.File), step}, nil
			}
			rename = func(from, to string) error {
				if step == "rename" {
					return &os.LinkError{Op: "rename", Old: from, New: to, Err: syscall.EXDEV}
				}
				return realRename(from, to)
			}
			err := Save(path, []byte(fresh))
			create, rename = realCreate, realRename
			kept := "nothing was written"
			if had {
				kept = "not written, the old file is as it was"
			}
			if err == nil || !errors.Is(err, cause) || !strings.HasPrefix(err.Error(), path+": "+kept+": ") || strings.Contains(err.Error(), ".part") {
				t.Errorf("%s, old file %v: error %v", step, had, err)
			}
			want := map[bool]string{true: "heron.xlsx"}[had]
			if inside(t, dir) != want || had && content(t, path) != old {
				t.Errorf("%s, old file %v: the folder holds %s", step, had, inside(t, dir))
			}
			if err := Save(path, []byte(fresh)); err != nil || content(t, path) != fresh || inside(t, dir) != "heron.xlsx" {
				t.Errorf("%s: the save after it: %v; the folder holds %s", step, err, inside(t, dir))
			}
		}
	}
}

// TestSaveWhereTheTemporaryFileGoes: another run may take the temporary file for
// what a killed one left, as when a clock jumps by an hour: it is written again,
// and if that happens again the old file is whole.
func TestSaveWhereTheTemporaryFileGoes(t *testing.T) {
	real := rename
	t.Cleanup(func() { rename = real })
	for _, times := range []int{1, 2} {
		dir := t.TempDir()
		path := filepath.Join(dir, "heron.xlsx")
		if err := os.WriteFile(path, []byte("old"), 0o666); err != nil {
			t.Fatal(err)
		}
		gone := 0
		rename = func(from, to string) error {
			if gone < times {
				gone++
				os.Remove(from)
			}
			return real(from, to)
		}
		err := Save(path, []byte("new"))
		want := map[int]string{1: "new", 2: "old"}[times]
		if (err == nil) != (times == 1) || content(t, path) != want || inside(t, dir) != "heron.xlsx" {
			t.Errorf("taken away %d times: %v; the file holds %q", times, err, content(t, path))
		}
		if times == 2 && !strings.Contains(err.Error(), "the old file is as it was") {
			t.Error(err)
		}
	}
}

// TestLeftoversUnderAWrongClock: a temporary file that seems to come from the
// future is left alone, and one that looks like a pattern matches only itself.
func TestLeftoversUnderAWrongClock(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "r[ab]*.xlsx")
	write := func(name string, age time.Duration) string {
		if err := os.WriteFile(name, []byte("half"), 0o666); err != nil {
			t.Skip("skipped: no file of such a name here: ", err)
		}
		at := time.Now().Add(-age)
		if err := os.Chtimes(name, at, at); err != nil {
			t.Fatal(err)
		}
		return filepath.Base(name)
	}
	gone := write(temporaryName(path, "1"), 3*time.Hour)
	kept := []string{
		write(temporaryName(path, "2"), -1000*time.Hour),
		write(temporaryName(filepath.Join(dir, "ra.xlsx"), "1"), 3*time.Hour),
		write(temporaryName(path, "1x"), 3*time.Hour),
		write(filepath.Join(dir, "r[ab]*.xlsx.part1"), 3*time.Hour),
	}
	clearLeftovers(path)
	left := inside(t, dir)
	for _, k := range kept {
		if !strings.Contains(left, k) {
			t.Errorf("%s is gone", k)
		}
	}
	if strings.Contains(","+left+",", ","+gone+",") {
		t.Errorf("%s is still there", gone)
	}
}

// TestLongNames: a file of the longest name that the system takes can be written,
// and one of a longer name is refused before anything runs.
func TestLongNames(t *testing.T) {
	if runtime.GOOS != "linux" {
		t.Skip("other systems have other limits")
	}
	dir := t.TempDir()
	for _, name := range []string{strings.Repeat("h", 250) + ".xlsx", strings.Repeat("ä", 125) + ".xlsx"} {
		path := filepath.Join(dir, name)
		for range 2 {
			if err := CheckTarget(path, "Heron", true); err != nil {
				t.Fatal(err)
			}
			if err := Save(path, []byte("whole")); err != nil || content(t, path) != "whole" {
				t.Fatal(err)
			}
		}
		os.Remove(path)
	}
	for _, force := range []bool{false, true} {
		err := CheckTarget(filepath.Join(dir, strings.Repeat("h", 251)+".xlsx"), "Heron", force)
		if err == nil || !strings.Contains(err.Error(), "give a shorter one") {
			t.Errorf("force %v: %v", force, err)
		}
	}
	if inside(t, dir) != "" {
		t.Errorf("left behind: %s", inside(t, dir))
	}
}
