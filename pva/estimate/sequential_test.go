package estimate

import (
	"math"
	"math/rand/v2"
	"testing"

	"ebbline/pva"
)

// TestPairedAtEveryLookCoverage: of 2,000 growing sets of pairs looked at after
// every doubling, at most 5 % ever exclude the true difference (binomial mean
// 100, false alarm 1e-8), and a single-look interval looked at as often misses
// more often than that, so that the test can fail.
func TestPairedAtEveryLookCoverage(t *testing.T) {
	const sets, only, other, both = 2000, 0.06, 0.02, 0.05
	margin := 5.73 * math.Sqrt(sets*.05*.95)
	src := rand.New(rand.NewPCG(17, 0))
	missed, single := 0, 0
	for range sets {
		var a, b, ab, n int64
		ever, once := false, false
		for size := int64(64); size <= 16384; size *= 2 {
			for ; n < size; n++ {
				switch u := src.Float64(); {
				case u < only:
					a++
				case u < only+other:
					b++
				case u < only+other+both:
					ab++
				}
			}
			d := Paired(a, b, ab, n-a-b-ab, .95)
			s := PairedAtEveryLook(d, .95)
			truth := only - other
			once = once || d.Low > truth || d.High < truth
			ever = ever || s.Low > truth || s.High < truth
			if s.Estimate != d.Estimate || s.Low > d.Estimate || s.High < d.Estimate {
				t.Fatalf("%+v of %+v", s, d)
			}
		}
		if ever {
			missed++
		}
		if once {
			single++
		}
	}
	if float64(missed) > sets*.05+margin {
		t.Errorf("%d of %d excluded the truth at some look", missed, sets)
	}
	if float64(single) < sets*.05+margin {
		t.Errorf("single-look intervals missed in %d only: the test shows nothing", single)
	}
	t.Logf("%d of %d; single-look intervals %d", missed, sets, single)
}

// TestToDecideAtEveryLook: with as many trials the sequence leaves the limit
// out, and with a tenth fewer it does not (whole counts jump by less than that).
func TestToDecideAtEveryLook(t *testing.T) {
	for _, p := range []struct{ x, n, limit float64 }{{60, 1000, .05}, {4, 1000, .005}, {540, 1000, .5}, {0, 100, .02}, {990, 1000, .995}} {
		limit := pva.Optional{Value: p.limit, Set: true}
		of := sequenced(int64(p.x), int64(p.n), .95)
		if Verdict(limit, of) != pva.Undecided {
			t.Fatalf("%+v is decided already: %+v", p, of)
		}
		n := ToDecideAtEveryLook(limit, of, .95)
		at := func(n int64) pva.Proportion { return sequenced(int64(math.Round(of.Estimate*float64(n))), n, .95) }
		if Verdict(limit, at(n)) == pva.Undecided || Verdict(limit, at(n-n/10-2)) != pva.Undecided {
			t.Errorf("%+v: %d trials settle it; there %+v, before %+v", p, n, at(n), at(n-n/10-2))
		}
		if single := ToDecide(limit, of, .95); n <= single {
			t.Errorf("%+v: %d trials, a single look takes %d", p, n, single)
		}
	}
	if n := ToDecideAtEveryLook(pva.Optional{Value: .05, Set: true}, sequenced(50, 1000, .95), .95); n != -1 {
		t.Errorf("%d at the limit itself", n)
	}
}

// TestAtEveryLook: every probability of an outcome is as wide as its sequence.
func TestAtEveryLook(t *testing.T) {
	p := Proportion(7, 400, .9)
	o := &pva.Outcome{Risk: p, Extinction: p, Years: []pva.YearResult{{Fallen: Proportion(3, 400, .9), Extinct: Proportion(1, 400, .9)}, {Fallen: p, Extinct: Proportion(2, 400, .9), Closed: Proportion(9, 390, .9)}},
		Smallest: []pva.Level{{Level: 4, Risk: Proportion(6, 400, .9)}}}
	AtEveryLook(o, .9)
	for _, got := range []pva.Proportion{o.Risk, o.Extinction, o.Years[0].Fallen, o.Years[0].Extinct, o.Years[1].Fallen, o.Years[1].Extinct, o.Years[1].Closed, o.Smallest[0].Risk} {
		if got != sequenced(got.Count, got.Of, .9) || got.Of == 0 {
			t.Errorf("%+v", got)
		}
	}
	if o.Risk.Count != 7 || o.Extinction.Count != 2 {
		t.Errorf("%+v %+v", o.Risk, o.Extinction)
	}
}
