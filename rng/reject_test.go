package rng

import (
	"math"
	"testing"
)

// The two rejection methods stand on inequalities that their author checked
// numerically: with the hat of the transformation, (a/us^2 + b) f(k) scaled as in
// the source is at most 1 everywhere, and at least vr where the quick test
// accepts. If the first failed, or the second, the law would be wrong by the
// excess. Here both are held, on a fine grid of u, with exact f; the Poisson one found
// the published constant of the hat short by 4 parts in a million.

// walkHat calls see with k and (a/us^2+b)/scale at n places of u in (0, 1/2) and
// at their mirror images.
func walkHat(n int, h hat, scale float64, see func(us, k, height float64)) {
	for i := 1; i < n; i++ {
		us := 0.5 * float64(i) / float64(n)
		for _, u := range []float64{0.5 - us, us - 0.5} {
			k := math.Floor((2*h.a/us+h.b)*u + h.c)
			see(us, k, (h.a/(us*us)+h.b)/scale)
		}
	}
}

func TestBinomialHatAndSqueeze(t *testing.T) {
	for _, p := range []float64{0.5, 0.4, 0.3, 0.1, 0.02, 1e-3, 1e-6} {
		for _, np := range []float64{10, 10.5, 12, 15, 20, 33.3, 60, 150, 1000, 20000, 1e7} {
			n := math.Round(np / p)
			if n*p < 10 {
				n++
			}
			l := binomialLaw(int64(n), p)
			peak := l.at(int64(math.Floor((n + 1) * p)))
			h := binomialHat(n, p)
			highest, lowest := 0.0, 1.0
			walkHat(20000, h, h.binomialScale(), func(us, k, height float64) {
				if k < 0 || k > n {
					if us >= 0.07 {
						t.Errorf("n = %v, p = %v: the quick test can accept %v", n, p, k)
					}
					return
				}
				r := l.at(int64(k)) / peak * height
				highest = math.Max(highest, r)
				if us >= 0.07 {
					lowest = math.Min(lowest, r)
				}
			})
			if highest > 1 || lowest < h.vr {
				t.Errorf("n = %v, p = %v: highest %v (want at most 1), lowest %v (want at least %v)", n, p, highest, lowest, h.vr)
			}
		}
	}
}

// TestBinomialBounds: at every distance from the mode, on both sides, the ratio of
// probabilities lies within the bounds that settle most rejections.
func TestBinomialBounds(t *testing.T) {
	looked, narrowest, most := 0, 1.0, 0.0
	for _, n := range []float64{448, 460, 500, 555, 700, 800, 1000, 1500, 3000, 10000, 1e5, 1e6} {
		for i := range 60 {
			least := math.Sqrt(binomialMeetTo / n) // below it hits are scattered
			p := least + (0.5-least)*float64(i)/59
			l := binomialLaw(int64(n), p)
			mode := math.Floor((n + 1) * p)
			peak, variance := l.at(int64(mode)), n*p*(1-p)
			reach := 9 * math.Sqrt(variance)
			for d := 1.0; d <= reach; d += math.Max(1, math.Floor(reach/500)) {
				for _, k := range []float64{mode - d, mode + d} {
					if k < 0 || k > n {
						continue
					}
					middle, margin := binomialBounds(k, mode, n, p)
					if margin >= 1 {
						continue
					}
					looked++
					r := l.at(int64(k)) / peak
					narrowest = math.Min(narrowest, margin)
					if n <= 10000 { // beyond, the logarithm has too few digits
						most = math.Max(most, math.Abs(math.Log(r/middle))/margin)
					}
					if r < middle*(1-margin) || r*(1-margin) > middle {
						t.Fatalf("n = %v, p = %v: at %v from the mode the ratio is %v, outside of %v and %v", n, p, k-mode, r, middle*(1-margin), middle/(1-margin))
					}
				}
			}
		}
	}
	if looked < 100000 || narrowest > 1e-5 || most > 0.78 || most < 0.5 {
		t.Errorf("%d ratios were looked at, with margins from %v; they come to %v of it", looked, narrowest, most)
	}
}

func TestPoissonHatAndSqueeze(t *testing.T) {
	for _, m := range []float64{poissonRejectFrom, 1024.4, 1024.9, 1100.5, 1500, 2000, 5000, 1e4, 1e6, 1e8} {
		l := poissonLaw(m)
		h := poissonHat(m)
		highest, lowest := 0.0, 1.0
		walkHat(20000, h, h.poissonScale(), func(us, k, height float64) {
			r := l.at(int64(k)) * height
			if us < 0.013 && r > us { // where v > us is turned away first
				t.Errorf("mean %v: at us = %v the hat allows %v", m, us, r)
			}
			highest = math.Max(highest, r)
			if us >= 0.07 {
				lowest = math.Min(lowest, r)
			}
		})
		if highest > 1 || lowest < h.vr {
			t.Errorf("mean %v: highest %v (want at most 1), lowest %v (want at least %v)", m, highest, lowest, h.vr)
		}
	}
}

// The probabilities in the acceptance steps against the exact laws, edges
// included.
func TestAcceptanceRatios(t *testing.T) {
	for _, c := range []struct {
		n int64
		p float64
	}{{600, 0.02}, {600, 0.5}, {4096, 0.3}, {100000, 1e-3}, {1 << 33, 0.4}} {
		l := binomialLaw(c.n, c.p)
		n := float64(c.n)
		m := math.Floor((n + 1) * c.p)
		for i := 0; i < len(l.prob); i += 1 + len(l.prob)/500 {
			k := l.low + int64(i)
			got := binomialRatio(float64(k), m, n, c.p)
			want := l.prob[i] / l.at(int64(m))
			// the law's own rounding grows with the distance from the mode
			within := 1e-13 + 3e-16*math.Abs(float64(k)-m)
			if math.Abs(got/want-1) > within*10 {
				t.Errorf("n = %d, p = %v: P(%d)/P(mode) = %v, want %v", c.n, c.p, k, got, want)
			}
		}
	}
	for _, m := range []float64{30, 1500.5, 1e6} {
		l := poissonLaw(m)
		for i := 0; i < len(l.prob); i += 1 + len(l.prob)/500 {
			k := float64(l.low) + float64(i)
			if got := poissonProb(k, m); math.Abs(got/l.prob[i]-1) > 1e-12+3e-15*math.Abs(k-m) {
				t.Errorf("mean %v: P(%v) = %v, want %v", m, k, got, l.prob[i])
			}
		}
	}
}
