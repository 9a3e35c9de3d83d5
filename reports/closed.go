package reports

import (
	"strings"

	"ebbline/pva"
)

// closedTable sets published formulas that apply to the case beside the figures
// of this assessment; nil where none applies.
func closedTable(a *pva.Assessment) *Table {
	if len(a.Closed) == 0 {
		return nil
	}
	b := newTable("closed", "Published formulas beside this answer").
		column("what", "", "", Format{}).column("value", "By the formula", "", Format{Kind: General}).column("unit", "Unit", "", Format{}).
		column("beside", "Here", "", Format{Kind: General}).column("beside_name", "which is", "", Format{}).
		column("difference", "Difference", "", Format{Kind: General})
	var notes []string
	for _, f := range a.Closed {
		cells := map[string]Cell{"what": text(f.Name), "value": num(f.Value), "unit": text(f.Unit)}
		notes = append(notes, sentence(f.Name)+": "+f.Note+" ("+f.Source+").")
		if f.Unit == "probability" {
			pct := Format{Percents, 4}
			v := num(f.Value)
			v.Format = pct
			cells["value"] = v
		}
		if f.BesideName != "" {
			here, gap := num(f.Beside), num(f.Beside-f.Value).by("{beside}-{value}", f.Beside-f.Value)
			if f.Unit == "probability" {
				here.Format, gap.Format = Format{Percents, 4}, Format{Percents, 4}
			}
			cells["beside"], cells["beside_name"], cells["difference"] = here, text(f.BesideName), gap
		}
		b.row(f.Name, cells)
	}
	b.t.Note = strings.Join(notes, " ")
	return b.t
}
