package estimate

import (
	"math"
	"testing"

	"ebbline/pva"
)

func limit(v float64) pva.Optional { return pva.Optional{Value: v, Set: true} }

func TestVerdict(t *testing.T) {
	for _, r := range []struct {
		limit     pva.Optional
		low, high float64
		want      pva.Verdict
	}{
		{limit(0.05), 0.01, 0.04, pva.Within},
		{limit(0.05), 0.01, 0.05, pva.Within},
		{limit(0.05), 0.01, 0.0500001, pva.Undecided},
		{limit(0.05), 0.05, 0.06, pva.Undecided},
		{limit(0.05), 0.0500001, 0.06, pva.AboveLimit},
		{pva.Optional{}, 0.5, 0.6, pva.NoVerdict},
	} {
		if got := Verdict(r.limit, pva.Proportion{Low: r.low, High: r.high}); got != r.want {
			t.Errorf("%v to %v against %v: %q, want %q", r.low, r.high, r.limit, got, r.want)
		}
	}
	for risk, want := range map[float64]pva.Verdict{0.0489: pva.Within, 0.0495: pva.Undecided, 0.0505: pva.Undecided, 0.0511: pva.AboveLimit} {
		if got := VerdictExact(limit(0.05), risk, 0.001); got != want {
			t.Errorf("exact risk %v: %q, want %q", risk, got, want)
		}
	}
	if got := VerdictExact(pva.Optional{}, 0.5, 0); got != pva.NoVerdict {
		t.Errorf("no limit: %q", got)
	}
}

// ToDecide is held against the verdicts themselves: with the estimate kept, the
// interval straddles the limit a little before the number and not a little
// after. A change of the number by a share d moves the gap, in standard errors,
// by d/2; rounding to a whole count moves it by up to half a count.
func TestToDecide(t *testing.T) {
	for _, r := range []struct {
		estimate, limit float64
	}{{0.048, 0.05}, {0.055, 0.05}, {0, 0.01}, {0.3, 0.31}, {0.92, 0.9}, {0.0009, 0.001}} {
		n := ToDecide(limit(r.limit), pva.Proportion{Estimate: r.estimate}, 0.95)
		at := func(n int64) pva.Verdict {
			return Verdict(limit(r.limit), Proportion(int64(math.Round(r.estimate*float64(n))), n, 0.95))
		}
		want := pva.Within
		if r.estimate > r.limit {
			want = pva.AboveLimit
		}
		little := 2 + int64(1.5/math.Abs(r.estimate-r.limit))
		if less, more := at(n-little), at(n+little); less != pva.Undecided || more != want || 2*little > n {
			t.Errorf("%v against %v settled at %d: %q before, %q after (%d either way)", r.estimate, r.limit, n, less, more, little)
		}
	}
	if got := ToDecide(limit(0.07), Proportion(7, 100, 0.95), 0.95); got != -1 {
		t.Errorf("an estimate at the limit is settled at %d, want never", got)
	}
	if got := ToDecide(limit(0.07), pva.Proportion{Estimate: math.Nextafter(0.07, 1)}, 0.95); got != -1 {
		t.Errorf("an estimate within rounding of the limit is settled at %d, want never", got)
	}
	if got := ToDecide(limit(0.07), Proportion(0, 0, 0.95), 0.95); got != -1 {
		t.Errorf("no estimate is settled at %d, want never", got)
	}
	if got := ToDecide(pva.Optional{}, Proportion(1, 2, 0.95), 0.95); got != -1 {
		t.Errorf("no limit is settled at %d, want never", got)
	}
}
