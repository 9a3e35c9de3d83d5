package workbook

import (
	"archive/zip"
	"bytes"
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/xuri/excelize/v2"

	"ebbline/reports"
)

// TestOwned: a report is known again as this program's own and as that of its
// case; anything else is not taken for one.
func TestOwned(t *testing.T) {
	folder := t.TempDir()
	r := report()
	path := filepath.Join(folder, "heron.xlsx")
	if err := reports.Save(path, bytesOf(t, r)); err != nil {
		t.Fatal(err)
	}
	is := func(what, path, title string, wantOurs, wantSame bool) {
		t.Helper()
		ours, same, err := reports.Owned(path, title)
		if ours != wantOurs || same != wantSame || err != nil {
			t.Errorf("%s: ours %v, of the same case %v, error %v", what, ours, same, err)
		}
	}
	is("the report", path, r.Title, true, true)
	is("the report of another case", path, r.Title+" ", true, false)

	// Saved by another program since: it may hold a reviewer's remarks.
	f, err := excelize.OpenFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if err := f.SetAppProps(&excelize.AppProperties{Application: "Another Office"}); err != nil {
		t.Fatal(err)
	}
	touched := filepath.Join(folder, "touched.xlsx")
	if err := f.SaveAs(touched); err != nil {
		t.Fatal(err)
	}
	f.Close()
	is("a report that another program saved", touched, r.Title, false, false)

	other := excelize.NewFile()
	foreign := filepath.Join(folder, "foreign.xlsx")
	if err := other.SaveAs(foreign); err != nil {
		t.Fatal(err)
	}
	other.Close()
	is("another workbook", foreign, r.Title, false, false)

	for name, data := range map[string][]byte{"empty": nil, "text": []byte("counts\n1\n2\n"), "half": bytesOf(t, r)[:2000], "bomb": bomb(t)} {
		p := filepath.Join(folder, name)
		if err := os.WriteFile(p, data, 0o644); err != nil {
			t.Fatal(err)
		}
		is(name, p, r.Title, false, false)
	}
	is("a folder", folder, r.Title, false, false)
	if _, _, err := reports.Owned(filepath.Join(folder, "none"), r.Title); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("a file that is not there: %v", err)
	}
}

// bomb is a small zip whose properties unpack to far more than is read.
func bomb(t *testing.T) []byte {
	var out bytes.Buffer
	w := zip.NewWriter(&out)
	for _, name := range []string{"docProps/app.xml", "docProps/custom.xml"} {
		e, err := w.Create(name)
		if err != nil {
			t.Fatal(err)
		}
		text := "<Properties><Application>ebbline</Application>" + strings.Repeat(" ", 8<<20) + "</Properties>"
		if _, err := e.Write([]byte(text)); err != nil {
			t.Fatal(err)
		}
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	return out.Bytes()
}
