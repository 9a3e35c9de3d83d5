package estimate

import (
	"math"
	"strings"
	"testing"
)

// TestPotentialRemoval: the formula of P. R. Wade 1998; the first two rows are
// published assessments of harbour porpoise in the western North Atlantic (from
// memory: least abundance 74,695 and level 747; 74,034 and 851).
func TestPotentialRemoval(t *testing.T) {
	for _, r := range []struct{ n, cv, rmax, f, least, removal float64 }{
		{89700, 0.22, 0.04, 0.5, 74695.157, 746.95157},
		{95543, 0.31, 0.046, 0.5, 74033.722, 851.3878},
		{1000, 0.5, 0.12, 1, 671.83361, 40.310017},
		{1000, 0, 0.12, 1, 1000, 60},
	} {
		got, err := PotentialRemoval(r.n, r.cv, r.rmax, r.f)
		if err != nil {
			t.Fatal(err)
		}
		// Eight digits are printed.
		if math.Abs(got.LeastAbundance-r.least) > 6e-8*r.least || math.Abs(got.Animals-r.removal) > 6e-8*r.removal {
			t.Errorf("%+v: %+v", r, got)
		}
	}
	for _, bad := range [][4]float64{{-1, 0, 0.1, 0.5}, {1, -0.1, 0.1, 0.5}, {1, 0, math.NaN(), 0.5}, {1, 0, 0.1, 1.5}} {
		if _, err := PotentialRemoval(bad[0], bad[1], bad[2], bad[3]); err == nil {
			t.Errorf("%v is not refused", bad)
		}
	}
}

// TestCriterionEHorizons: the time rules of the Red List, version 3.1.
func TestCriterionEHorizons(t *testing.T) {
	for generation, want := range map[float64][3]float64{2: {10, 20, 100}, 5: {15, 25, 100}, 8: {24, 40, 100}, 25: {75, 100, 100}, 40: {100, 100, 100}} {
		rows, err := CriterionE(nil, generation)
		if err != nil {
			t.Fatal(err)
		}
		for i, row := range rows {
			if row.Horizon != want[i] || row.Threshold != []float64{0.5, 0.2, 0.1}[i] {
				t.Errorf("generation %g: %s: %g within %g, want %g years", generation, row.Name, row.Threshold, row.Horizon, want[i])
			}
			if row.Standing != Unknown || row.Reason == "" {
				t.Errorf("without a risk %s is %q (%s)", row.Name, row.Standing, row.Reason)
			}
		}
	}
	for _, bad := range []float64{0, -1, math.NaN(), math.Inf(1)} {
		if _, err := CriterionE(nil, bad); err == nil {
			t.Errorf("a generation length of %g is not refused", bad)
		}
	}
	if _, err := CriterionE([]YearRisk{{Year: 2}}, 5); err == nil || !strings.Contains(err.Error(), "year 1") {
		t.Errorf("a gap in the curve: %v", err)
	}
}

// TestCriterionEStandings: equality counts ("at least"), a straddling interval
// is undecided, a short curve is known only where it has reached the threshold.
func TestCriterionEStandings(t *testing.T) {
	curve := func(years int, e, low, high float64) []YearRisk {
		out := make([]YearRisk, years)
		for i := range out {
			out[i] = YearRisk{i + 1, e, low, high}
		}
		return out
	}
	for _, r := range []struct {
		curve []YearRisk
		want  [3]Standing
	}{
		{curve(100, 0.5, 0.5, 0.5), [3]Standing{Reached, Reached, Reached}},
		{curve(100, 0.4999, 0.4999, 0.4999), [3]Standing{NotReached, Reached, Reached}},
		{curve(100, 0.15, 0.09, 0.21), [3]Standing{NotReached, Straddles, Straddles}},
		{curve(100, 0.15, 0.1, 0.2), [3]Standing{NotReached, Straddles, Reached}},
		{curve(30, 0.15, 0.14, 0.16), [3]Standing{NotReached, NotReached, Reached}},
		{curve(30, 0.05, 0.04, 0.06), [3]Standing{NotReached, NotReached, Unknown}},
	} {
		rows, err := CriterionE(r.curve, 5)
		if err != nil {
			t.Fatal(err)
		}
		for i, row := range rows {
			if row.Standing != r.want[i] {
				t.Errorf("%g over %d years: %s is %q, want %q", r.curve[0].Estimate, len(r.curve), row.Name, row.Standing, r.want[i])
			}
		}
	}
	// Each row looks at its own year.
	rising := make([]YearRisk, 100)
	for i := range rising {
		v := float64(i+1) / 100
		rising[i] = YearRisk{i + 1, v, v, v}
	}
	rows, _ := CriterionE(rising, 6.2) // 18.6 and 31 years
	for i, year := range []int{18, 31, 100} {
		if rows[i].Year != year || rows[i].Risk.Estimate != float64(year)/100 {
			t.Errorf("%s looks at year %d, want %d", rows[i].Name, rows[i].Year, year)
		}
	}
}
