package estimate

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"

	"ebbline/pva"
)

// A worked example of Newcombe 1998, Stat. Med. 17:2635-2650, method 10, four
// decimals, from memory: 36 with both, 12 and 2 with one only, none with neither.
func TestPairedAgainstNewcombe(t *testing.T) {
	d := Paired(12, 2, 36, 0, 0.95)
	near(t, "the difference", d.Estimate, 0.2, 1e-15)
	near(t, "its lower limit", d.Low, 0.0569, 0.5001e-4)
	near(t, "its upper limit", d.High, 0.3404, 0.5001e-4)
	if d.OnlyThis != 12 || d.OnlyOther != 2 || d.Of != 50 {
		t.Errorf("the counts are %d and %d of %d", d.OnlyThis, d.OnlyOther, d.Of)
	}
}

// Where the correlation is 0 or known the limits have a closed form in Wilson's.
func TestPairedClosedForms(t *testing.T) {
	z := distuv.UnitNormal.Quantile(0.975)
	const n = 54
	// Fallen in this always and in the other never: both risks are a limit's
	// width w = z²/(n+z²) from an end, and the two are uncorrelated.
	w := z * z / (n + z*z)
	d := Paired(n, 0, 0, 0, 0.95)
	near(t, "the lower limit of 1", d.Low, 1-math.Sqrt2*w, 1e-14)
	near(t, "the upper limit of 1", d.High, 1, 0)
	// None fallen anywhere, or all everywhere.
	for _, d := range []pva.Difference{Paired(0, 0, 0, n, 0.95), Paired(0, 0, n, 0, 0.95)} {
		near(t, "the difference of none", d.Estimate, 0, 0)
		near(t, "its lower limit", d.Low, -w, 1e-14)
		near(t, "its upper limit", d.High, w, 1e-14)
	}
	// No discordant pair, a fallen in both and e in neither: phi is
	// (ae - n/2)/(ae), so that the square is (u-v)² + uv n/(ae), where u and v
	// are the distances of Wilson's limits from the estimate.
	for _, r := range [][2]int64{{36, 14}, {710, 9290}, {3, 99997}} {
		a, e := r[0], r[1]
		low, high := Wilson(a, a+e, 0.95)
		p := float64(a) / float64(a+e)
		u, v := p-low, high-p
		want := math.Sqrt((u-v)*(u-v) + u*v*float64(a+e)/(float64(a)*float64(e)))
		d := Paired(0, 0, a, e, 0.95)
		// The square is a difference of terms up to 2uv: an error of a few
		// 2^-52 of them, which the root can at most double to this.
		near(t, "the lower limit", d.Low, -want, 1e-14*u*v/want+1e-16)
		near(t, "the upper limit", d.High, want, 1e-14*u*v/want+1e-16)
	}
}

// Exchanging the two risks, or fallen and not fallen, only turns the sign.
func TestPairedSymmetry(t *testing.T) {
	for _, r := range [][4]int64{{12, 2, 36, 0}, {330, 20, 380, 9270}, {0, 5, 0, 95}, {7, 0, 3, 0}, {0, 0, 1, 999}, {1, 1, 1, 1}, {1e8, 2e8, 3e8, 4e8}} {
		d := Paired(r[0], r[1], r[2], r[3], 0.9)
		for _, m := range []pva.Difference{Paired(r[1], r[0], r[2], r[3], 0.9), Paired(r[1], r[0], r[3], r[2], 0.9), Reversed(d)} {
			near(t, "the estimate turned round", m.Estimate, -d.Estimate, 0)
			near(t, "the lower limit turned round", m.Low, -d.High, 1e-15)
			near(t, "the upper limit turned round", m.High, -d.Low, 1e-15)
			if m.OnlyThis != d.OnlyOther || m.OnlyOther != d.OnlyThis || m.Of != d.Of {
				t.Errorf("%v turned round has counts %v", r, m)
			}
		}
		if !(d.Low <= d.Estimate && d.Estimate <= d.High && d.Low >= -1 && d.High <= 1) {
			t.Errorf("%v: %v outside %v to %v", r, d.Estimate, d.Low, d.High)
		}
	}
	if d := Paired(0, 0, 0, 0, 0.95); !math.IsNaN(d.Estimate) || d.Low != -1 || d.High != 1 {
		t.Errorf("no replicates: %v", d)
	}
}

func TestAgainst(t *testing.T) {
	tally := pva.NewTally(2)
	tally.Replicates = 1000
	tally.Years[1] = pva.YearTally{Fallen: 80, OnlyThis: 30, OnlyCase: 7}
	if got, want := Against(tally, 0.95), Paired(30, 7, 50, 913, 0.95); got != want {
		t.Errorf("from the tally %v, want %v", got, want)
	}
}

// The exact coverage of the interval, summed over every table of n pairs under
// its multinomial law; the table keeps what was found, so that a change is seen.
// The method is approximate: coverage is at the level in the mean and dips below
// it in places, by less than 3 points in this table.
func TestCoverageOfPaired(t *testing.T) {
	const n = 30
	sum := 0.0
	rows := []struct{ onlyThis, onlyOther, both, want float64 }{
		{0.03, 0.002, 0.04, 0.999778}, {0.1, 0.02, 0.2, 0.968225}, {0.2, 0.2, 0.3, 0.956795}, {0.05, 0.05, 0.02, 0.991364},
		{0.3, 0.05, 0.05, 0.957375}, {0, 0, 0.3, 1}, {0.02, 0, 0.9, 0.999975}, {0.15, 0.01, 0.5, 0.941761},
	}
	for _, r := range rows {
		law := func(k, of int, p float64) float64 {
			if p == 0 { // gonum gives no number here
				return toFloat(k == 0)
			}
			return distuv.Binomial{N: float64(of), P: p}.Prob(float64(k))
		}
		covered, all, rest := 0.0, 0.0, 1-r.both
		for a := 0; a <= n; a++ {
			pa := law(a, n, r.both)
			for b := 0; a+b <= n; b++ {
				pb := law(b, n-a, r.onlyThis/rest)
				for c := 0; a+b+c <= n; c++ {
					p := pa * pb * law(c, n-a-b, r.onlyOther/(rest-r.onlyThis))
					d := Paired(int64(b), int64(c), int64(a), int64(n-a-b-c), 0.95)
					all += p
					if truth := r.onlyThis - r.onlyOther; d.Low <= truth && truth <= d.High {
						covered += p
					}
				}
			}
		}
		t.Logf("only this %v, only other %v, both %v: %.6f", r.onlyThis, r.onlyOther, r.both, covered)
		near(t, "the sum of the law", all, 1, 1e-10)
		near(t, "the coverage", covered, r.want, 1e-6)
		if covered < 0.92 {
			t.Errorf("%v: the interval covers in %v only", r, covered)
		}
		sum += covered
	}
	if mean := sum / float64(len(rows)); mean < 0.95 {
		t.Errorf("mean coverage is %v", mean)
	}
}
