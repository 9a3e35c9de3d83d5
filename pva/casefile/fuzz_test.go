package casefile

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// FuzzRead: no bytes make Read panic, every fault stands at a line of the file,
// and what is read survives writing and reading, as a file and as rows.
func FuzzRead(f *testing.F) {
	for _, data := range goodCases(f) {
		f.Add(data)
	}
	wrong, err := filepath.Glob(filepath.Join(wrongFiles, "*.toml"))
	if err != nil || len(wrong) == 0 {
		f.Fatalf("no wrong cases: %v", err)
	}
	for _, file := range wrong {
		data, err := os.ReadFile(file)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(data)
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		c, errs := Read("fuzz.toml", data)
		if (c == nil) != (len(errs) > 0) {
			t.Fatalf("a case %v and %d errors", c != nil, len(errs))
		}
		if c == nil {
			said := errs.Text(true)
			if strings.ContainsAny(said, "\x00\x1b\a\b") {
				t.Errorf("control characters in %q", said)
			}
			lines := strings.Count(string(data), "\n") + 1
			for i, e := range errs {
				if i < mostShown && (e.Line > lines || e.offset != nowhere && (e.Line < 1 || e.Col < 1)) {
					t.Errorf("%d lines, and a fault at %d:%d", lines, e.Line, e.Col)
				}
			}
			return
		}
		text := Write(c)
		again, errs := Read("again.toml", text)
		if len(errs) > 0 {
			t.Fatalf("written and read: %v\n%s", errs, text)
		}
		if again.Digest() != c.Digest() {
			t.Errorf("the digest changes by writing\n%s", text)
		}
		rows, errs := FromRows("again.xlsx", ToRows(c))
		if len(errs) > 0 {
			t.Fatalf("as rows: %v", errs)
		}
		if rows.Digest() != c.Digest() {
			t.Error("the digest changes as rows")
		}
	})
}

// FuzzParseSetting: no text makes an override panic, and an error is one line.
func FuzzParseSetting(f *testing.F) {
	for _, s := range []string{"harvest.control.take=4", "births.by_year=[1,0.9]", "births.crowding={form='linear',capacity=900}", "option.half.set={}", "births.rate={value=1}", "=", "a=\n[b]", "births.steps=[{from=2}]"} {
		f.Add(s)
	}
	base := mustRead(f, "base", []byte(withControl))
	f.Fuzz(func(t *testing.T, text string) {
		settings, err := ParseSetting(text)
		if err != nil {
			if strings.ContainsAny(err.Error(), "\n\x00\x1b") {
				t.Errorf("%q", err)
			}
			return
		}
		c, errs := Override(base, settings)
		if len(errs) > 0 {
			return
		}
		if again, errs := Read("again.toml", Write(c)); len(errs) > 0 || again.Digest() != c.Digest() {
			t.Errorf("%q: written and read: %v", text, errs)
		}
	})
}
