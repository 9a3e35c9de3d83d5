package reports_test

import (
	"math"
	"testing"

	"ebbline/pva"
	"ebbline/reports"
	"ebbline/reports/internal/invented"
)

// TestYardstickTables: the potential biological removal of 89,700 animals (CV
// 0.22), largest growth 0.04 and recovery factor 0.5 is 747 (a published
// harbour porpoise level, from memory), and criterion E asks for 50, 20 and 10 %.
func TestYardstickTables(t *testing.T) {
	given := func(path string, v float64) pva.Entry {
		return pva.Entry{Path: path, Value: pva.Num(v), Origin: pva.FromCase}
	}
	c := invented.Case(given("start.abundance", 89700), given("start.cv", .22), given("yardsticks.max_growth", .04), given("yardsticks.recovery_factor", .5), given("yardsticks.generation_length", 8))
	r := reports.Build(invented.Assessment(c, 2000), reports.Meta{})
	if got := r.Table("potential_removal").Cell("removal", "value").Num; math.Abs(got-746.95157) > 1e-4 {
		t.Errorf("potential biological removal %v, want 746.95", got)
	}
	e := r.Table("criterion_e")
	for category, want := range map[string][2]float64{"Critically Endangered": {.5, 24}, "Endangered": {.2, 40}, "Vulnerable": {.1, 100}} {
		if e.Cell(category, "threshold").Num != want[0] || e.Cell(category, "horizon").Num != want[1] {
			t.Errorf("%s: at least %v within %v, want %v", category, e.Cell(category, "threshold").Num, e.Cell(category, "horizon").Num, want)
		}
	}
	if r := reports.Build(invented.Assessment(invented.Case(), 2000), reports.Meta{}); r.Table("criterion_e") != nil || r.Table("potential_removal") != nil {
		t.Error("a case that states nothing for the yardsticks has them")
	}
}
