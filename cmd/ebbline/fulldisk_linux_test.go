package main

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
)

// mounted mounts a small file system of its own in the working folder.
func mounted(t *testing.T, at, options string) {
	t.Helper()
	if err := os.MkdirAll(at, 0o777); err != nil {
		t.Fatal(err)
	}
	if err := syscall.Mount("tmpfs", at, "tmpfs", 0, options); err != nil {
		t.Skipf("no file system can be mounted here (%v): the faults of single steps stand for it", err)
	}
	path, err := filepath.Abs(at)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { syscall.Unmount(path, syscall.MNT_DETACH) })
}

// fill leaves no room on a disk.
func fill(t *testing.T, dir string) (empty func()) {
	t.Helper()
	path := filepath.Join(dir, "filler")
	f, err := os.Create(path)
	if err != nil {
		t.Fatal(err)
	}
	for err == nil {
		_, err = f.Write(make([]byte, 4096))
	}
	f.Close()
	return func() { os.Remove(path) }
}

// contents is every file below a folder.
func contents(t *testing.T, dir string) map[string]string {
	t.Helper()
	out := map[string]string{}
	err := filepath.WalkDir(dir, func(path string, d os.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		data, err := os.ReadFile(path)
		out[path] = string(data)
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return out
}

// diskCommands are the commands that write files, into the folder disk.
var diskCommands = map[string][]string{
	"assess":  {"assess", "pond.toml", "--no-exact", "--out", "disk/a.xlsx", "--json", "disk/a.json", "--csv", "disk/a", "--figures", "disk/f", "--force"},
	"exact":   {"exact", "pond.toml", "--force", "--json", "disk/e.json"},
	"sweep":   {"sweep", "pond.toml", "--no-exact", "--out", "disk/s.xlsx", "--json", "disk/s.json", "--csv", "disk/s", "--force", "--ledger", "disk/s.ledger"},
	"each":    {"sweep", "pond.toml", "--each", "10%", "--replicates", "64", "--out", "disk/t.xlsx", "--csv", "disk/t", "--force"},
	"minimum": {"minimum", "pond.toml", "--no-exact", "--out", "disk/m.xlsx", "--csv", "disk/m", "--force", "--ledger", "m.ledger"},
	"new":     {"new", "disk/n.toml", "--force"},
	"sheet":   {"new", "disk/n.xlsx", "--force"},
	"example": {"example", "marsh-heron", "disk/x.toml", "--force"},
	"fit":     {"fit", "counts.csv", "--write", "disk/fit.toml", "--survival", "0.8", "--json", "disk/fit.json", "--force"},
}

const someCounts = "year,count\n2001,51\n2002,60\n2003,48\n2004,55\n2005,63\n2006,58\n2007,70\n2008,66\n2009,59\n2010,72\n2011,75\n2012,69\n"

// TestOnAFullDisk: every command on a disk that is full, with old files on it and
// without: status 1 (or 2 where nothing was begun), no file changes, nothing half
// written is left, and with room again the same command works.
func TestOnAFullDisk(t *testing.T) {
	inFolder(t)
	if err := os.WriteFile("counts.csv", []byte(someCounts), 0o666); err != nil {
		t.Fatal(err)
	}
	mounted(t, "disk", "size=4m")
	for _, old := range []bool{false, true} {
		for name, args := range diskCommands {
			if old { // files of another run of the same command
				if status, _, errs := command(newRoot, args...); status != 0 {
					t.Fatalf("%s: status %d: %s", name, status, errs)
				}
				os.RemoveAll("disk/s.ledger")
				os.RemoveAll("m.ledger")
				for f := range contents(t, "disk") { // of other sizes, so that no room is made for the new ones
					if err := os.WriteFile(f, []byte("an old "+f), 0o666); err != nil {
						t.Fatal(err)
					}
				}
			}
			room := fill(t, "disk")
			before := contents(t, "disk")
			status, out, errs := command(newRoot, args...)
			if status != 1 && !(status == 2 && name == "sweep") || !strings.Contains(errs, "no space left on device") || strings.Contains(errs, ".part") || strings.Contains(errs, "goroutine") {
				t.Errorf("%s, old files %v: status %d: %s", name, old, status, errs)
			}
			if old && status == 1 && name != "sweep" && name != "minimum" && !strings.Contains(errs, "the old file is as it was") && name != "each" {
				t.Errorf("%s: what is kept is not said: %s", name, errs)
			}
			if longRun := name == "sweep" || name == "each" || name == "minimum"; longRun && status == 1 && !strings.Contains(errs, "--resume") {
				t.Errorf("%s: how to go on is not said: %s", name, errs)
			}
			if name == "assess" && !strings.Contains(out, "with the take") {
				t.Errorf("the answer is lost with the file: %q", out)
			}
			after := contents(t, "disk")
			for f, data := range after {
				if was, there := before[f]; !there && data != "" || there && was != data {
					t.Errorf("%s, old files %v: %s is another or has come (%d bytes)", name, old, f, len(data))
				}
				if strings.Contains(f, ".part") || strings.Contains(f, ".ebbline-") {
					t.Errorf("%s, old files %v: %s is left", name, old, f)
				}
			}
			for f := range before {
				if _, there := after[f]; !there {
					t.Errorf("%s: %s is gone", name, f)
				}
			}
			room()
			again := args
			if name == "sweep" || name == "minimum" || name == "each" {
				again = append(append([]string(nil), args...), "--resume")
			}
			if status, _, errs := command(newRoot, again...); status != 0 {
				t.Errorf("%s, old files %v: with room again: status %d: %s", name, old, status, errs)
			}
			for _, d := range []string{"disk", "m.ledger"} {
				entries, _ := os.ReadDir(d)
				for _, e := range entries {
					os.RemoveAll(filepath.Join(d, e.Name()))
				}
			}
			os.Remove("m.ledger")
		}
	}
}

// TestADiskThatFillsInASweep: the ledger and the live table run out of room in the
// middle; what is finished is kept, and with room again the bytes are those of a
// run that was not disturbed.
func TestADiskThatFillsInASweep(t *testing.T) {
	inFolder(t)
	args := func(name, ledger string, more ...string) []string {
		return append([]string{"sweep", "pond.toml", "--no-exact", "--quiet", "--set", "sweep.1.to=40", "--set", "sweep.1.step=1", "--out", name + ".xlsx", "--json", name + ".json", "--ledger", ledger}, more...)
	}
	mustRun(t, newRoot, args("one", "one.ledger")...)
	for _, size := range []string{"size=12k", "size=24k", "size=40k", "size=64k"} {
		t.Run(size, func(t *testing.T) {
			mounted(t, "small", size+",nr_inodes=64")
			status, _, errs := command(newRoot, args("two", "small/l")...)
			if status == 0 {
				t.Skip("this much room is enough")
			}
			if !strings.Contains(errs, "no space left on device") || status == 1 && !strings.Contains(errs, "--resume") {
				t.Errorf("status %d: %s", status, errs)
			}
			if _, err := os.Stat("two.xlsx"); err == nil {
				t.Error("a report is there")
			}
			if err := syscall.Mount("", "small", "", syscall.MS_REMOUNT, "size=16m,nr_inodes=64"); err != nil {
				t.Fatal(err)
			}
			status, _, errs = command(newRoot, args("two", "small/l", "--resume")...)
			if status != 0 {
				t.Fatalf("with room again: status %d: %s", status, errs)
			}
			same(t, "one.json", "two.json")
			os.Remove("two.json")
			os.Remove("two.xlsx")
			syscall.Unmount("small", syscall.MNT_DETACH)
		})
	}
}

// TestWithoutPermission: a folder that takes no file is told before anything runs,
// and everything in it stays.
func TestWithoutPermission(t *testing.T) {
	inFolder(t)
	if err := os.WriteFile("counts.csv", []byte(someCounts), 0o666); err != nil {
		t.Fatal(err)
	}
	mounted(t, "disk", "size=4m")
	for _, args := range diskCommands {
		if status, _, errs := command(newRoot, args...); status != 0 {
			t.Fatalf("%v: status %d: %s", args, status, errs)
		}
	}
	os.RemoveAll("m.ledger")
	before := contents(t, "disk")
	if err := syscall.Mount("", "disk", "", syscall.MS_REMOUNT|syscall.MS_RDONLY, ""); err != nil {
		t.Fatal(err)
	}
	for name, args := range diskCommands {
		status, _, errs := command(newRoot, args...)
		want := 2
		if name == "fit" { // it computes nothing that would be lost
			want = 1
		}
		if status != want || !strings.Contains(errs, "read-only file system") {
			t.Errorf("%s: status %d: %s", name, status, errs)
		}
	}
	after := contents(t, "disk")
	for f, data := range before {
		if !bytes.Equal([]byte(after[f]), []byte(data)) {
			t.Errorf("%s is another", f)
		}
	}
	if len(after) != len(before) {
		t.Errorf("%d files, %d before", len(after), len(before))
	}
}
