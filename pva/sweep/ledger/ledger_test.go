package ledger

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"syscall"
	"testing"
)

func manifest() Manifest {
	return Manifest{Program: "ebbline", Format: Format, Version: "1", Command: "sweep", Title: "an invented pond", Digest: "sha256:1", Seed: 7, Replicates: 100,
		What: "harvest.1.take", Cells: 3, Group: 3, Range: 64, Units: 2, Case: "[case]\ntitle = \"an invented pond\"\n"}
}

func open(t *testing.T, dir string) *Ledger {
	t.Helper()
	l, err := Open(dir, manifest(), "")
	if err != nil {
		t.Fatal(err)
	}
	return l
}

// fill writes n records and closes.
func fillLedger(t *testing.T, dir string, from, n int) {
	t.Helper()
	l := open(t, dir)
	for i := from; i < from+n; i++ {
		if err := l.Append(fmt.Sprint("unit ", i), []byte(strings.Repeat(fmt.Sprint(i), i+1))); err != nil {
			t.Fatal(err)
		}
	}
	if err := l.Close(); err != nil {
		t.Fatal(err)
	}
}

func read(t *testing.T, dir string) (map[string]string, []Damage) {
	t.Helper()
	got := map[string]string{}
	d, err := open(t, dir).Read(func(key string, data []byte) error { got[key] = string(data); return nil })
	if err != nil {
		t.Fatal(err)
	}
	return got, d
}

func recordFile(t *testing.T, dir string) string {
	t.Helper()
	names, err := list(dir, isRecords)
	if err != nil || len(names) == 0 {
		t.Fatal("no record file", err)
	}
	return names[0]
}

func TestWriteAndRead(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "a [strange] folder*")
	fillLedger(t, dir, 0, 5)
	fillLedger(t, dir, 5, 5) // a second writer: a file of its own
	got, damage := read(t, dir)
	if len(got) != 10 || len(damage) != 0 {
		t.Fatalf("%d records, damage %v", len(got), damage)
	}
	for i := range 10 {
		if want := strings.Repeat(fmt.Sprint(i), i+1); got[fmt.Sprint("unit ", i)] != want {
			t.Errorf("unit %d: %q", i, got[fmt.Sprint("unit ", i)])
		}
	}
	if err := Remove(dir); err != nil {
		t.Fatal(err)
	}
	if _, err := os.Stat(dir); !errors.Is(err, os.ErrNotExist) {
		t.Error("the folder is still there")
	}
}

// TestEveryByte flips each bit of each byte of a small record file in turn: what is
// handed out is always what was written, the damaged record is never among it,
// and the records around it are.
func TestEveryByte(t *testing.T) {
	dir := t.TempDir()
	fillLedger(t, dir, 0, 4)
	name := recordFile(t, dir)
	good, err := os.ReadFile(name)
	if err != nil {
		t.Fatal(err)
	}
	whole, _ := read(t, dir)
	l := open(t, dir)
	for at := range good {
		for bit := range 8 {
			bad := append([]byte(nil), good...)
			bad[at] ^= 1 << bit
			got := map[string]string{}
			damage, err := l.scan(bad, func(key string, data []byte) error { got[key] = string(data); return nil })
			if err != nil {
				t.Fatal(err)
			}
			if len(damage) != 1 || len(got) != len(whole)-1 {
				t.Fatalf("byte %d bit %d: %d records and damage %v", at, bit, len(got), damage)
			}
			for k, v := range got {
				if whole[k] != v {
					t.Fatalf("byte %d bit %d: %s was handed out as %q", at, bit, k, v)
				}
			}
		}
	}
}

// TestCut cuts the file at every length: only the last record is lost, and the
// end is called torn, unless it is at the end of a record.
func TestCut(t *testing.T) {
	dir := t.TempDir()
	fillLedger(t, dir, 0, 3)
	good, err := os.ReadFile(recordFile(t, dir))
	if err != nil {
		t.Fatal(err)
	}
	l := open(t, dir)
	ends := map[int]int{0: 0}
	for at := 0; at < len(good); {
		_, _, size, ok := l.parse(good[at:])
		if !ok {
			t.Fatal("a good record is not read")
		}
		at += size
		ends[at] = len(ends)
	}
	whole := 0
	for cut := 0; cut <= len(good); cut++ {
		if n, end := ends[cut]; end {
			whole = n
		}
		n := 0
		damage, _ := l.scan(good[:cut], func(string, []byte) error { n++; return nil })
		_, atEnd := ends[cut]
		if n != whole || atEnd != (len(damage) == 0) || (!atEnd && !damage[0].Torn) {
			t.Fatalf("cut at %d: %d records, want %d; damage %v", cut, n, whole, damage)
		}
	}
}

func TestOtherRunsAreRefused(t *testing.T) {
	dir := t.TempDir()
	fillLedger(t, dir, 0, 1)
	for want, change := range map[string]func(*Manifest){
		"version":    func(m *Manifest) { m.Version = "2" },
		"seed":       func(m *Manifest) { m.Seed = 8 },
		"replicates": func(m *Manifest) { m.Replicates = 101 },
		"title":      func(m *Manifest) { m.Digest, m.Case = "sha256:2", "[case]\ntitle = \"another\"\n" },
		"grid":       func(m *Manifest) { m.What = "harvest.2.take" },
		"units":      func(m *Manifest) { m.Range = 128 },
		"command":    func(m *Manifest) { m.Command = "minimum" },
	} {
		m := manifest()
		change(&m)
		_, err := Open(dir, m, "")
		if !errors.Is(err, ErrOther) || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: %v", want, err)
		}
	}
	// A file of records of another run, put into this folder by hand.
	other := t.TempDir()
	m := manifest()
	m.Seed = 9
	l, err := Open(other, m, "")
	if err != nil {
		t.Fatal(err)
	}
	if err := l.Append("unit 0", []byte("forged")); err != nil {
		t.Fatal(err)
	}
	l.Close()
	data, _ := os.ReadFile(recordFile(t, other))
	os.WriteFile(filepath.Join(dir, "records-forged.log"), data, 0o666)
	got, damage := read(t, dir)
	if got["unit 0"] != "0" || len(damage) != 1 {
		t.Errorf("records of another run: %q, damage %v", got["unit 0"], damage)
	}
}

func TestManifestDamage(t *testing.T) {
	dir := t.TempDir()
	fillLedger(t, dir, 0, 1)
	name := filepath.Join(dir, manifestName)
	good, err := os.ReadFile(name)
	if err != nil {
		t.Fatal(err)
	}
	space := 0
	for at := range good {
		bad := append([]byte(nil), good...)
		bad[at] ^= 1
		os.WriteFile(name, bad, 0o666)
		m, err := ReadManifest(dir)
		if err != nil {
			continue
		}
		// Blanks between the fields may change; what it says may not.
		if m.Difference(manifest()) != "" || m.CaseFile != "" {
			t.Fatalf("byte %d: a damaged manifest is read as %+v", at, m)
		}
		space++
	}
	if space > len(good)/4 {
		t.Fatalf("%d of %d flips went unseen", space, len(good))
	}
}

func TestDuplicates(t *testing.T) {
	dir := t.TempDir()
	fillLedger(t, dir, 0, 3)
	fillLedger(t, dir, 1, 3)
	if got, damage := read(t, dir); len(got) != 4 || len(damage) != 0 {
		t.Fatalf("%v %v", got, damage)
	}
	l := open(t, dir)
	if err := l.Append("unit 2", []byte("something else")); err != nil {
		t.Fatal(err)
	}
	l.Close()
	_, err := l.Read(func(string, []byte) error { return nil })
	if err == nil || !strings.Contains(err.Error(), "unit 2") || !strings.Contains(err.Error(), "different figures") {
		t.Fatal(err)
	}
}

// fullDisk takes so many bytes and no more, as a full disk does.
type fullDisk struct {
	f    file
	room int
}

func (d *fullDisk) Write(p []byte) (int, error) {
	if len(p) > d.room {
		n, _ := d.f.Write(p[:d.room])
		d.room = 0
		return n, &os.PathError{Op: "write", Path: "x", Err: syscall.ENOSPC}
	}
	d.room -= len(p)
	return d.f.Write(p)
}
func (d *fullDisk) Sync() error  { return d.f.Sync() }
func (d *fullDisk) Close() error { return d.f.Close() }

// TestFullDisk: the message names the cause and what to do, and what was
// written before is there afterwards.
func TestFullDisk(t *testing.T) {
	real := createFile
	defer func() { createFile = real }()
	createFile = func(name string) (file, error) {
		f, err := real(name)
		return &fullDisk{f, 130}, err
	}
	dir := t.TempDir()
	l := open(t, dir)
	wrote := 0
	var err error
	for i := 0; i < 20 && err == nil; i++ {
		if err = l.Append(fmt.Sprint(i), []byte("0123456789")); err == nil {
			wrote++
		}
	}
	if err == nil || !errors.Is(err, syscall.ENOSPC) || !strings.Contains(err.Error(), "no space left") || !strings.Contains(err.Error(), "--resume") {
		t.Fatal(err)
	}
	if again := l.Append("later", nil); again == nil {
		t.Error("a ledger that failed takes more")
	}
	l.Close()
	createFile = real
	got, damage := read(t, dir)
	if wrote == 0 || len(got) != wrote || len(damage) != 1 || !damage[0].Torn {
		t.Errorf("%d of %d records, damage %v", len(got), wrote, damage)
	}
}

// TestManyWriters: goroutines and several ledgers on one folder at once.
func TestManyWriters(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "l")
	var wg sync.WaitGroup
	for w := range 8 {
		wg.Add(1)
		go func() {
			defer wg.Done()
			l, err := Open(dir, manifest(), "shard")
			if err != nil {
				t.Error(err)
				return
			}
			for i := range 20 {
				if err := l.Append(fmt.Sprint(w, " ", i), []byte{byte(w), byte(i)}); err != nil {
					t.Error(err)
				}
			}
			if err := l.Close(); err != nil {
				t.Error(err)
			}
		}()
	}
	wg.Wait()
	if got, damage := read(t, dir); len(got) != 160 || len(damage) != 0 {
		t.Errorf("%d records, damage %v", len(got), damage)
	}
}
