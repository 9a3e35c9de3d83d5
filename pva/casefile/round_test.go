package casefile

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"ebbline/pva"
	"ebbline/pva/casefile/examples"
)

const goodFiles = "../../testdata/cases"

// goodCases is every case that stands ready: the files of testdata/cases, the
// built-in examples and the starter.
func goodCases(t testing.TB) map[string][]byte {
	out := map[string][]byte{"starter": Starter()}
	for _, name := range examples.Names() {
		data, err := examples.Get(name)
		if err != nil {
			t.Fatal(err)
		}
		out[name] = data
	}
	files, err := filepath.Glob(filepath.Join(goodFiles, "*.toml"))
	if err != nil || len(files) == 0 {
		t.Fatalf("no cases in %s: %v", goodFiles, err)
	}
	for _, file := range files {
		data, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		out[filepath.Base(file)] = data
	}
	return out
}

func mustRead(t testing.TB, name string, data []byte) *pva.Case {
	t.Helper()
	c, errs := Read(name, data)
	if len(errs) > 0 {
		t.Fatalf("%v", errs)
	}
	return c
}

// TestWriteReadKeepsTheCase holds for each case: what Write makes is read as
// the same case, and written again it is the same text.
func TestWriteReadKeepsTheCase(t *testing.T) {
	for name, data := range goodCases(t) {
		t.Run(name, func(t *testing.T) {
			c := mustRead(t, name, data)
			text := Write(c)
			again, errs := Read("again.toml", text)
			if len(errs) > 0 {
				t.Fatalf("%v\n%s", errs, text)
			}
			sameCase(t, c, again)
			if twice := Write(again); !bytes.Equal(text, twice) {
				t.Errorf("written twice:\n%s\nand\n%s", text, twice)
			}
		})
	}
}

// sameCase compares two cases entry by entry, seeds to the last digit.
func sameCase(t *testing.T, c, d *pva.Case) {
	t.Helper()
	if c.Digest() != d.Digest() {
		t.Error("the digests differ")
	}
	if c.Run != d.Run {
		t.Errorf("run %+v, want %+v", d.Run, c.Run)
	}
	a, b := c.Entries(), d.Entries()
	if len(a) != len(b) {
		t.Fatalf("%d entries, want %d", len(b), len(a))
	}
	for i := range a {
		a[i].Value.Text, b[i].Value.Text = numberless(a[i].Value), numberless(b[i].Value)
		if a[i] != b[i] {
			t.Errorf("entry %+v, want %+v", b[i], a[i])
		}
	}
}

// numberless is a value's text, but not how the digits of a number are written.
func numberless(v pva.Value) string {
	if v.Kind == pva.NumberKind {
		return ""
	}
	return v.Text
}

// TestWaysOfWriting reads two files that state one case in different TOML.
func TestWaysOfWriting(t *testing.T) {
	good := goodCases(t)
	plain := mustRead(t, "same-plain.toml", good["same-plain.toml"])
	other := mustRead(t, "same-otherwise.toml", good["same-otherwise.toml"])
	sameCase(t, plain, other)
	for _, change := range []func([]byte) []byte{
		func(b []byte) []byte { return append([]byte(byteOrderMark), b...) },
		func(b []byte) []byte { return bytes.ReplaceAll(b, []byte("\n"), []byte("\r\n")) },
		func(b []byte) []byte { return bytes.TrimRight(b, "\n") },
	} {
		sameCase(t, plain, mustRead(t, "changed", change(good["same-plain.toml"])))
	}
}

// TestLineBreaksInTexts reads a text of two lines the same from files with
// either kind of line break.
func TestLineBreaksInTexts(t *testing.T) {
	text := goodCases(t)["pulse-every-key.toml"]
	unix := mustRead(t, "unix", text)
	sameCase(t, unix, mustRead(t, "other", bytes.ReplaceAll(text, []byte("\n"), []byte("\r\n"))))
	if want := "to hold every key\non two lines"; unix.Purpose != want {
		t.Errorf("purpose %q, want %q", unix.Purpose, want)
	}
}

// TestEveryKeyIsInSomeCase makes sure that the round trips above leave no key out.
func TestEveryKeyIsInSomeCase(t *testing.T) {
	used := map[*pva.Key]bool{}
	for name, data := range goodCases(t) {
		for _, e := range mustRead(t, name, data).Entries() {
			if k, _ := pva.Find(e.Path); k != nil {
				used[k] = true
			}
		}
	}
	// A death side with a capacity of its own stands in river-cod.
	for _, k := range pva.Keys() {
		if !used[k] {
			t.Errorf("%s is in no case", k.Path)
		}
	}
}

// TestSeedKeepsAllDigits: a double has 53 bits, a seed 64.
func TestSeedKeepsAllDigits(t *testing.T) {
	for _, seed := range []string{"18446744073709551615", "9007199254740993", "0xFFFFFFFFFFFFFFFF", "18_446_744_073_709_551_615"} {
		c := mustRead(t, "seed", []byte(smallCase+"[run]\nseed = "+seed+"\n"))
		want := map[bool]uint64{true: 18446744073709551615, false: 9007199254740993}[!strings.HasPrefix(seed, "9")]
		if c.Run.Seed != want {
			t.Errorf("seed %s read as %d", seed, c.Run.Seed)
		}
		if again := mustRead(t, "again", Write(c)); again.Run.Seed != want {
			t.Errorf("seed %s written and read as %d", seed, again.Run.Seed)
		}
	}
}

// TestProvenance reads source and note from every way of giving them.
func TestProvenance(t *testing.T) {
	c := mustRead(t, "same-otherwise.toml", goodCases(t)["same-otherwise.toml"])
	got := map[string]pva.Entry{}
	for _, e := range c.Entries() {
		got[e.Path] = e
	}
	if e := got["start.abundance"]; e.Source != "assumed" || e.Note != "by eye" || e.Value.Num != 255 {
		t.Errorf("start.abundance %+v", e)
	}
	if e := got["births.rate"]; e.Source != "invented" || e.Value.Num != 0.4 {
		t.Errorf("births.rate %+v", e)
	}
	c = mustRead(t, "pulse-every-key.toml", goodCases(t)["pulse-every-key.toml"])
	for _, e := range c.Entries() {
		switch e.Path {
		case "deaths.by_year.1", "deaths.by_year.2", "deaths.by_year.3":
			if e.Source != "invented" || e.Note != "for all three" {
				t.Errorf("%s has source %q and note %q", e.Path, e.Source, e.Note)
			}
		case "births.by_year.3":
			if e.Source != "invented" {
				t.Errorf("%s has source %q", e.Path, e.Source)
			}
		case "births.by_year.1", "births.by_year.2":
			if e.Source != "" {
				t.Errorf("%s has source %q", e.Path, e.Source)
			}
		}
	}
}
