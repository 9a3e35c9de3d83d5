package sheet

import (
	"strconv"
	"strings"

	"ebbline/pva"
)

// explanation is what the second sheet of the starter says: headings end in a
// colon.
var explanation = []string{
	"The population on the sheet Inputs is invented. Put your own figures in, save the workbook, then run: ebbline check FILE.xlsx",
	"What a row is:",
	"Each row gives one number or word of the case under its key. Only the columns Key, Value, Source and Note are read; Unit and what stands to the right of Note are for you. The order of the rows does not matter, and blank rows are passed over.",
	"Keep the headings in row 1 and the columns where they are. Do not merge cells.",
	"Where numbers come from:",
	"Name under Source what each number rests on: a survey, a paper, a page of the application. Write assumed where it is your assumption. A number without a source is listed as unsourced in the report: a reviewer must be able to see which inputs rest on nothing.",
	"Say under Note what a reviewer should know: how it was measured, for which animals, over which years.",
	"Values:",
	"Where a cell has a list, choose from it. Percentages are fractions: write 0.05, or format the cell as a percentage. A cell may hold a formula; it is read by the value stored with it, so save the workbook after a change.",
	"Dates are not read: a year is a whole number. Write a number of more than 15 digits (a seed, perhaps) as text.",
	"A range of years is a text: 2027-2056, 2030- or -2040.",
	"More rows:",
	"Add a key from the sheet All keys in a row of its own. A key that is not there keeps its default. Only the keys marked as required must be given.",
	"Where a key has NAME in it, put a name of your own choice there, the same for all keys of one rule: harvest.control.take and harvest.control.when belong to the take called control. A second name makes a second rule. Names have no dots.",
	"Where a key ends in a number, it is one of a list: births.by_year.1, births.by_year.2 and so on.",
	"An option is an alternative that is assessed beside the case: option.NAME.set. and after it any key, with the value that the option gives it. Where an option gives a list anew, give the list's own key the value (list), and its elements below.",
	"Then:",
	"ebbline check FILE.xlsx prints the case as it was understood. ebbline assess FILE.xlsx runs it and writes a report. The sheet Inputs of a report has this very form: change it, save it under a new name, and it is a case again.",
}

// explain writes the second sheet.
func (s *starter) explain() {
	sheet := explainSheet
	s.widths(sheet, 110)
	s.say(sheet, "A1", "How to fill in a case", "title")
	s.try(s.f.SetRowHeight(sheet, 1, 24))
	row := 2
	for _, t := range explanation {
		style := ""
		if strings.HasSuffix(t, ":") {
			t, style = strings.TrimSuffix(t, ":"), "bold"
			row++
		}
		s.say(sheet, "A"+strconv.Itoa(row), t, style)
		s.tall(sheet, row, []string{t}, []float64{112})
		row++
	}
	no := false
	s.try(s.f.SetSheetView(sheet, 0, viewWithoutGrid(&no)))
	s.page(sheet, "$A$1:$A$"+strconv.Itoa(row), false)
}

// keys writes every key of a case with what may be given under it.
func (s *starter) keys() {
	sheet := keysSheet
	widths := []float64{34, 22, 16, 92}
	s.widths(sheet, widths...)
	s.head(sheet, 1, "Key", "Unit", "Default", "What to give")
	row, top := 1, ""
	write := func(key, unit, standard, asks string) {
		row++
		at := strconv.Itoa(row)
		mark := "line"
		if group, _, _ := strings.Cut(key, "."); group != top {
			top, mark = group, "line first"
		}
		s.say(sheet, "A"+at, key, mark+" bold")
		s.say(sheet, "B"+at, unit, mark+" grey")
		s.say(sheet, "C"+at, standard, mark)
		s.say(sheet, "D"+at, asks, mark)
		s.tall(sheet, row, []string{key, unit, standard, asks}, widths)
	}
	for _, k := range pva.Keys() {
		if strings.HasSuffix(writtenKey(k.Path), ".NAME.name") {
			continue // NAME itself says it
		}
		write(writtenKey(k.Path), k.Unit, defaultWords(k), k.Asks())
	}
	write("option.NAME.set.KEY", "as the key", "", "what the option gives the key")
	s.page(sheet, "$A$1:$D$"+strconv.Itoa(row), true)
}

// writtenKey is a key as a person is to write it.
func writtenKey(path string) string {
	parts := strings.Split(path, ".")
	for i, p := range parts {
		if p != "*" {
			continue
		}
		parts[i] = "1"
		if k, _ := pva.Find(parts[0] + ".1.name"); i == 1 && k != nil {
			parts[i] = "NAME"
		}
	}
	return strings.Join(parts, ".")
}

func defaultWords(k *pva.Key) string {
	switch d := k.Default.(type) {
	case float64:
		return strings.Replace(strconv.FormatFloat(d, 'g', -1, 64), "e+0", "e", 1)
	case bool:
		return strconv.FormatBool(d)
	case string:
		if d != "" {
			return d
		}
	}
	if k.Required {
		return "required"
	}
	return "none"
}
