package ledger

import (
	"bytes"
	"flag"
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"testing"
	"time"
)

var long = flag.Bool("long", false, "push ten million mutated ledgers through, or as many as an hour allows")

// written is the records of a small ledger, and what they hold.
func written(t testing.TB) (*Ledger, []byte, map[string]string) {
	t.Helper()
	l, err := Open(t.TempDir(), manifest(), "")
	if err != nil {
		t.Fatal(err)
	}
	var file []byte
	holds := map[string]string{}
	for i, data := range []string{"", "0", "some figures", mark, mark + "\x00\x00\x00\x00", string(bytes.Repeat([]byte{0xff}, 300))} {
		key := fmt.Sprint("unit ", i)
		file = append(file, l.record(key, []byte(data))...)
		holds[key] = data
	}
	return l, file, holds
}

// trusted faults a record that is handed out and was not written, damage that
// lies outside the file, and bytes that are neither damage nor a record.
func trusted(t *testing.T, l *Ledger, holds map[string]string, file []byte) (records int) {
	t.Helper()
	covered := 0
	damage, err := l.scan(file, func(key string, data []byte) error {
		want, there := holds[key]
		if !there || want != string(data) {
			t.Errorf("handed out: %q %q, which was never written", key, data)
		}
		records++
		covered += len(l.record(key, data))
		return nil
	})
	if err != nil {
		t.Error(err)
	}
	for _, d := range damage {
		if d.At < 0 || d.Bytes < 1 || d.At+d.Bytes > int64(len(file)) {
			t.Errorf("damage %+v in a file of %d bytes", d, len(file))
		}
		covered += int(d.Bytes)
	}
	if covered != len(file) {
		t.Errorf("%d of %d bytes are accounted for", covered, len(file))
	}
	return records
}

// FuzzRecords: whatever stands in a file of records, only what was written is
// handed out.
func FuzzRecords(f *testing.F) {
	l, file, holds := written(f)
	f.Add(file)
	f.Add(file[:len(file)-1])
	f.Add(append(file[20:len(file):len(file)], file...))
	f.Add([]byte(mark + "\xff\xff\xff\xff"))
	f.Add([]byte(mark + "\x01\x00\x00\x00\x80" + string(make([]byte, 32))))
	f.Fuzz(func(t *testing.T, data []byte) {
		trusted(t, l, holds, data)
		// And behind what is sound.
		if n := trusted(t, l, holds, append(file[:len(file):len(file)], data...)); n < len(holds) {
			t.Errorf("%d of %d records before the damage are handed out", n, len(holds))
		}
	})
}

// believed faults a manifest that is read and says anything but what was written.
func believed(t *testing.T, dir string, data []byte) bool {
	t.Helper()
	if err := os.WriteFile(filepath.Join(dir, manifestName), data, 0o666); err != nil {
		t.Fatal(err)
	}
	m, err := ReadManifest(dir)
	if err != nil {
		return false
	}
	want := manifest()
	want.Checksum = want.checksum()
	if fmt.Sprintf("%+v", m) != fmt.Sprintf("%+v", want) {
		t.Errorf("read: %+v", m)
	}
	return true
}

// soundManifest is a manifest as it is written.
func soundManifest(t testing.TB) []byte {
	t.Helper()
	dir := t.TempDir()
	if err := manifest().write(dir); err != nil {
		t.Fatal(err)
	}
	data, err := os.ReadFile(filepath.Join(dir, manifestName))
	if err != nil {
		t.Fatal(err)
	}
	return data
}

// FuzzManifest: a manifest is damaged or says what was written.
func FuzzManifest(f *testing.F) {
	good := soundManifest(f)
	f.Add(good)
	f.Add(bytes.ReplaceAll(good, []byte("seed"), []byte("SEED")))
	f.Add(bytes.Replace(good, []byte("{"), []byte(`{"seed": 8,`), 1))
	f.Add(bytes.Replace(good, []byte("}"), []byte(`, "Seed": 8}`), 1))
	f.Add([]byte("null"))
	dir := f.TempDir()
	f.Fuzz(func(t *testing.T, data []byte) { believed(t, dir, data) })
}

// TestMutatedLedgers is both for inputs that are the same each time.
func TestMutatedLedgers(t *testing.T) {
	n := 30_000
	if *long {
		n = 10_000_000
	}
	l, file, holds := written(t)
	good, dir := soundManifest(t), t.TempDir()
	g, began, i := rand.New(rand.NewPCG(5, 6)), time.Now(), 0
	records, manifests := 0, 0
	for ; i < n && !t.Failed() && (i%1000 > 0 || time.Since(began) < time.Hour); i++ {
		source := file
		if i%10 == 0 { // a manifest takes a file each time
			source = good
		}
		data := bytes.Clone(source)
		for range 1 + g.IntN(3) {
			at := g.IntN(len(data) + 1)
			end := min(len(data), at+1+g.IntN(40))
			switch g.IntN(5) {
			case 0, 1:
				if at < len(data) {
					data[at] ^= byte(1 << g.IntN(8))
				}
			case 2:
				data = append(data[:at:at], data[end:]...)
			case 3:
				data = append(data[:end:end], data[at:]...)
			default:
				from := g.IntN(len(source))
				data = append(append(data[:at:at], source[from:min(len(source), from+g.IntN(80))]...), data[at:]...)
			}
		}
		if i%10 > 0 {
			records += trusted(t, l, holds, data)
		} else if believed(t, dir, data) {
			manifests++
		}
	}
	t.Logf("%d mutated inputs in %v: %d records and %d manifests were sound", i, time.Since(began).Round(time.Second), records, manifests)
	if records < i || records > i*len(holds)*9/10 || manifests > i/20 {
		t.Errorf("%d records and %d manifests of %d inputs: the mutations are not what they should be", records, manifests, i)
	}
}
