package workbook

import (
	"bytes"
	"testing"

	"github.com/xuri/excelize/v2"

	"ebbline/reports"
	"ebbline/reports/internal/invented"
)

// TestMapIsShaded: a map's numbers carry a colour scale, its heading and first
// column do not, and no other table has one.
func TestMapIsShaded(t *testing.T) {
	r := reports.Build(invented.Assessment(invented.Case(), 2000), reports.Meta{})
	shaded := func() map[string][]excelize.ConditionalFormatOptions {
		data, err := Bytes(r)
		if err != nil {
			t.Fatal(err)
		}
		f, err := excelize.OpenReader(bytes.NewReader(data))
		if err != nil {
			t.Fatal(err)
		}
		defer f.Close()
		formats, err := f.GetConditionalFormats(reports.PartRisk)
		if err != nil {
			t.Fatal(err)
		}
		return formats
	}
	if n := len(shaded()); n != 0 {
		t.Fatalf("%d colour scales on a sheet without a map", n)
	}
	r.Table("years").Shaded = true
	formats := shaded()
	if len(formats) != 1 {
		t.Fatalf("%d colour scales, want 1", len(formats))
	}
	for area, f := range formats {
		if area[0] == 'A' || f[0].Type != "2_color_scale" {
			t.Errorf("%s is shaded as %q", area, f[0].Type)
		}
	}
}
