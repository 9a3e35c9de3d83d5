package reports

import (
	"math"
	"testing"
)

// TestPercentDigits: the last digit is about as large as the standard error
// sqrt(p(1-p)/n); the expected texts were worked out by hand from it.
func TestPercentDigits(t *testing.T) {
	for _, c := range []struct {
		p    float64
		n    int64
		want string
	}{
		{0.071, 10000, "7.1 %"},     // 0.26 points
		{0.071, 1000, "7.1 %"},      // 0.81 points
		{0.071, 100, "7 %"},         // 2.6 points
		{0.0712, 1000000, "7.12 %"}, // 0.026 points
		{0.0004, 10000, "0.04 %"},   // 0.02 points
		{0.9996, 10000, "99.96 %"},  // the same
		{0.00075, 4000, "0.075 %"},  // two significant digits at least
		{0.0005, 4000, "0.05 %"},    // without the zero at the end
		{5.9e-19, 0, "<0.000001 %"}, {2e-10, 10000, "<0.000001 %"},
		{0, 10000, "0 %"}, {1, 10000, "100 %"},
		{0.07049, 0, "7.05 %"}, {0.0000123456, 0, "0.00123 %"}, {math.NaN(), 100, "unknown %"},
	} {
		if got := Percent(c.p, c.n); got != c.want {
			t.Errorf("Percent(%v, %d) = %q, not %q", c.p, c.n, got, c.want)
		}
	}
	if got := PercentRange(0.0662, 0.0762, 10000); got != "6.6 to 7.6 %" {
		t.Errorf("range %q", got)
	}
	if got := PercentRange(0, 0.00038, 10000); got != "0 to 0.038 %" {
		t.Errorf("range from zero %q", got)
	}
	for d, want := range map[float64]string{0.0312: "3.1", -0.0312: "-3.1", 0: "0"} {
		if got := PointsText(d, 10000); got != want {
			t.Errorf("PointsText(%v) = %q, not %q", d, got, want)
		}
	}
}

func TestNumbersAsWritten(t *testing.T) {
	for v, want := range map[float64]string{
		0: "0", 8: "8", -1234567: "-1,234,567", 0.45: "0.45", 1234.5: "1,234.5", -0.002: "-0.002", -1234.5: "-1,234.5",
		1e-9: "1e-09", 1e9: "1,000,000,000", 2e20: "2e+20", math.Nextafter(0.3, 1): "0.30000000000000004",
	} {
		if got := Plain(v); got != want {
			t.Errorf("Plain(%v) = %q, not %q", v, got, want)
		}
	}
	if got := Significant(1.0584999999999, 5); got != "1.0585" {
		t.Errorf("Significant: %q", got)
	}
}

func TestFormatsShow(t *testing.T) {
	for _, c := range []struct {
		f    Format
		v    float64
		want string
	}{
		{Format{Counts, 0}, 12345, "12,345"}, {Format{Dates, 0}, 2027, "2027"},
		{Format{Decimal, 2}, 1234.567, "1,234.57"}, {Format{Decimal, 1}, -0.04, "0.0"}, {Format{Decimal, 1}, -12.34, "-12.3"},
		{Format{Percents, 1}, 0.0712, "7.1 %"}, {Format{Percents, 1}, 0, "0 %"}, {Format{Percents, 1}, 0.0001, "0.01 %"}, {Format{Percents, 1}, 0.0006, "0.06 %"},
		{Format{Percents, 1}, 0.0005, "0.05 %"}, {Format{Percents, 1}, 0.00456, "0.46 %"}, {Format{Percents, 1}, 0.99996, "99.996 %"}, {Format{Percents, 3}, 4.8e-11, "<0.000001 %"},
		{Format{Percents, 3}, 4.8e-8, "0.0000048 %"}, {Format{Points, 3}, -0.0002, "0"}, {Format{Points, 3}, 0.0002, "0"},
		{Format{Points, 1}, 3.12, "+3.1"}, {Format{Points, 1}, -3.12, "-3.1"}, {Format{Points, 1}, 0, "0"},
		{Format{General, 0}, 0.125, "0.125"},
	} {
		if got := c.f.Show(c.v); got != c.want {
			t.Errorf("%+v shows %v as %q, not %q", c.f, c.v, got, c.want)
		}
	}
}
