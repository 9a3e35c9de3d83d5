package ledger

import (
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
)

// faulty is a file on which one step goes wrong from its n-th call on.
type faulty struct {
	f    file
	step string
	good int // calls that still go well
}

func (d *faulty) Write(p []byte) (int, error) {
	if d.good--; d.good >= 0 {
		return d.f.Write(p)
	}
	switch d.step {
	case "full disk":
		n, _ := d.f.Write(p[:len(p)/2])
		return n, &os.PathError{Op: "write", Path: "x", Err: syscall.ENOSPC}
	case "short write":
		return d.f.Write(p[:len(p)-1])
	}
	return d.f.Write(p)
}

func (d *faulty) Sync() error {
	if d.step == "sync" {
		return &os.PathError{Op: "sync", Path: "x", Err: syscall.EIO}
	}
	return d.f.Sync()
}

func (d *faulty) Close() error {
	err := d.f.Close()
	if d.step == "close" {
		return &os.PathError{Op: "close", Path: "x", Err: syscall.EDQUOT}
	}
	return err
}

var causes = map[string]error{"full disk": syscall.ENOSPC, "short write": io.ErrShortWrite, "sync": syscall.EIO, "close": syscall.EDQUOT, "create": syscall.EROFS}

// TestRecordsUnderEveryFault: whatever step of the records fails, the error says
// what is kept and how to go on; a record that was accepted is handed out
// afterwards, one that was not is never handed out other than it was; and the
// next writer goes on.
func TestRecordsUnderEveryFault(t *testing.T) {
	real := createFile
	t.Cleanup(func() { createFile = real })
	for step, cause := range causes {
		dir := t.TempDir()
		createFile = func(name string) (file, error) {
			if step == "create" {
				return nil, &os.PathError{Op: "open", Path: name, Err: syscall.EROFS}
			}
			f, err := real(name)
			if err != nil {
				return nil, err
			}
			return &faulty{f, step, 3}, nil
		}
		l := open(t, dir)
		data := func(i int) string { return strings.Repeat(fmt.Sprint(i), 20) }
		var failed error
		accepted := map[string]string{}
		for i := range 6 {
			key := fmt.Sprint("unit ", i)
			err := l.Append(key, []byte(data(i)))
			if err == nil && failed != nil {
				t.Errorf("%s: a ledger that failed takes more", step)
			}
			if err == nil {
				accepted[key] = data(i)
			} else {
				failed = err
			}
		}
		if err := l.Close(); failed == nil {
			failed = err
		}
		createFile = real
		if failed == nil || !errors.Is(failed, cause) || !strings.Contains(failed.Error(), "what is finished is kept") || !strings.Contains(failed.Error(), "--resume") || strings.Contains(failed.Error(), dir+"/") {
			t.Errorf("%s: error %v", step, failed)
		}
		got, damage := read(t, dir)
		for key, want := range accepted {
			if got[key] != want {
				t.Errorf("%s: %s was accepted as %q and is handed out as %q", step, key, want, got[key])
			}
		}
		for key, v := range got {
			if want := data(int(key[len(key)-1] - '0')); v != want {
				t.Errorf("%s: %s is handed out as %q", step, key, v)
			}
		}
		torn := step == "full disk" || step == "short write"
		if torn != (len(damage) == 1) || torn && !damage[0].Torn {
			t.Errorf("%s: damage %v", step, damage)
		}
		fillLedger(t, dir, 7, 2)
		if again, _ := read(t, dir); len(again) != len(got)+2 {
			t.Errorf("%s: %d records and 2 more give %d", step, len(got), len(again))
		}
	}
}

// TestManifestUnderEveryFault: a manifest is there whole or not at all, nothing
// is left beside it, the error names the folder and the cause, and the next try
// works. Where links fail the file is renamed.
func TestManifestUnderEveryFault(t *testing.T) {
	realCreate, realLink, realRename := createManifest, link, rename
	restore := func() { createManifest, link, rename = realCreate, realLink, realRename }
	t.Cleanup(restore)
	steps := map[string]error{"rename": syscall.EIO, "no links": nil}
	for k, v := range causes {
		steps[k] = v
	}
	for step, cause := range steps {
		dir := t.TempDir()
		createManifest = func(dir string) (file, string, error) {
			if step == "create" {
				return nil, "", &os.PathError{Op: "open", Path: dir, Err: syscall.EROFS}
			}
			f, name, err := realCreate(dir)
			if err != nil {
				return nil, "", err
			}
			return &faulty{f, step, 0}, name, nil
		}
		if step == "rename" || step == "no links" {
			link = func(a, b string) error { return &os.LinkError{Op: "link", Old: a, New: b, Err: syscall.EPERM} }
		}
		if step == "rename" {
			rename = func(a, b string) error { return &os.LinkError{Op: "rename", Old: a, New: b, Err: syscall.EIO} }
		}
		_, err := Open(dir, manifest(), "")
		restore()
		left, _ := os.ReadDir(dir)
		if cause == nil {
			if err != nil || len(left) != 1 {
				t.Errorf("%s: %v, %v", step, err, left)
			}
		} else if !errors.Is(err, cause) || !errors.Is(err, ErrFolder) || !strings.Contains(err.Error(), dir) || strings.Contains(err.Error(), temporaryPrefix) || len(left) != 0 {
			t.Errorf("%s: error %v; the folder holds %v", step, err, left)
		}
		fillLedger(t, dir, 0, 2)
		if got, damage := read(t, dir); len(got) != 2 || len(damage) != 0 {
			t.Errorf("%s: the run after it: %v, %v", step, got, damage)
		}
	}
}

// TestAManifestIsNeverReplaced: the ledger of another run is as it was.
func TestAManifestIsNeverReplaced(t *testing.T) {
	dir := t.TempDir()
	fillLedger(t, dir, 0, 1)
	name := filepath.Join(dir, manifestName)
	before, err := os.ReadFile(name)
	if err != nil {
		t.Fatal(err)
	}
	other := manifest()
	other.Seed = 99
	if err := other.write(dir); err != nil {
		t.Fatal(err)
	}
	if after, err := os.ReadFile(name); err != nil || string(after) != string(before) {
		t.Errorf("the manifest was replaced: %v", err)
	}
}
