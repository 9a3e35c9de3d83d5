package sheet

import (
	"bytes"
	"os"
	"testing"

	"ebbline/pva"
	"ebbline/pva/casefile"
)

// TestStarter: the starter workbook is read as the starter case, without its
// sources, and is always the same file.
func TestStarter(t *testing.T) {
	data := starterBytes(t)
	got, errs := Read("new.xlsx", data)
	if len(errs) > 0 {
		t.Fatal(errs)
	}
	want, errs := casefile.Read("starter.toml", casefile.Starter())
	if len(errs) > 0 {
		t.Fatal(errs)
	}
	a, b := pva.Ordered(got.Entries()), pva.Ordered(want.Entries())
	if len(a) != len(b) || len(a) < 25 {
		t.Fatalf("%d entries, the starter has %d", len(a), len(b))
	}
	for i := range a {
		if a[i].Path != b[i].Path || a[i].Value.Kind != b[i].Value.Kind || a[i].Value.Num != b[i].Value.Num || a[i].Value.String() != b[i].Value.String() {
			t.Errorf("%s = %v, in the starter %s = %v", a[i].Path, a[i].Value, b[i].Path, b[i].Value)
		}
		if a[i].Source != "" {
			t.Errorf("%s has the source %q; the cell is for its reader to fill", a[i].Path, a[i].Source)
		}
	}
	for range 20 {
		again, err := Starter()
		if err != nil || !bytes.Equal(data, again) {
			t.Fatalf("not the same bytes twice (%v)", err)
		}
	}
	if dir := os.Getenv("EBBLINE_LOOK"); dir != "" { // to be looked at
		if err := os.WriteFile(dir+"/starter.xlsx", data, 0o666); err != nil {
			t.Fatal(err)
		}
	}
}

func starterBytes(t testing.TB) []byte {
	t.Helper()
	data, err := Starter()
	if err != nil {
		t.Fatal(err)
	}
	return data
}
