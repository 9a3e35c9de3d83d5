package casefile

import (
	"strings"
	"testing"

	"ebbline/pva"
)

// TestWriteWordsWithoutSource: a word may have a source and note in a workbook
// but has none in a case file; written, it is a plain word, and what is written
// is read.
func TestWriteWordsWithoutSource(t *testing.T) {
	origin := func(path string, v pva.Value) pva.Entry {
		return pva.Entry{Path: path, Value: v, Source: "field notes", Note: "of two seasons", Origin: pva.FromCase}
	}
	c, faults := pva.Build([]pva.Entry{
		origin("case.title", pva.Text("Invented herons")), origin("question.threshold", pva.Num(20)), origin("question.horizon", pva.Num(30)),
		origin("start.abundance", pva.Num(90)), origin("births.breeding", pva.Text("pulse")), origin("births.rate", pva.Num(0.4)),
		origin("births.crowding.form", pva.Text("ricker")), origin("births.crowding.capacity", pva.Num(120)), origin("deaths.fraction", pva.Num(0.2)),
		origin("uncertain.1.key", pva.Text("births.rate")), origin("uncertain.1.law", pva.Text("normal")), origin("uncertain.1.sd", pva.Num(0.02)),
	})
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	text := Write(c)
	again, errs := Read("written.toml", text)
	if len(errs) > 0 {
		t.Fatalf("%v\n%s", errs, text)
	}
	if got := strings.Count(string(text), "field notes"); got != 7 {
		t.Errorf("%d sources are written, want those of the 7 numbers:\n%s", got, text)
	}
	if again.Title != "Invented herons" {
		t.Errorf("read back: %+v", again)
	}
}
