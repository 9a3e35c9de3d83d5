package draws

import (
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
)

// TestOutside: of a normal law at one standard deviation above 0, Phi(-1) = 15.87 %
// (Abramowitz & Stegun 1964, table 26.1) cannot be a birth rate. So many of the
// slices, to within one, are drawn anew and counted, what is left follows the
// law cut off at 0, and it is warned of.
func TestOutside(t *testing.T) {
	const n = 2000
	d := design(t, goats(t, 5, n, []uncertain{around("births.rate", "normal", 0.3), around("deaths.fraction", "normal", 0.09)}, nil))
	part := distuv.UnitNormal.CDF(-1)
	if got := d.Inputs[0].Outside; math.Abs(float64(got)-part*n) > 1 {
		t.Errorf("%d of %d draws were outside, want %.1f", got, n, part*n)
	}
	// Of the death fraction Phi(-0.15/0.09) = 4.8 % lies below 0: no warning.
	other := distuv.UnitNormal.CDF(-0.15 / 0.09)
	if got := d.Inputs[1].Outside; math.Abs(float64(got)-other*n) > 1 {
		t.Errorf("%d of %d draws were outside, want %.1f", got, n, other*n)
	}
	if r := float64(d.Redrawn()); r < part*n-1 || r > (part+other)*n+2 {
		t.Errorf("%v draws redrawn", r)
	}
	law := distuv.Normal{Mu: 0.3, Sigma: 0.3}
	cut := func(x float64) float64 { return (law.CDF(x) - law.CDF(0)) / (1 - law.CDF(0)) }
	if k := distance(column(d, 0), cut); k > limit(n) {
		t.Errorf("distance from the law cut off at 0: %v, at most %v", k, limit(n))
	}
	for _, v := range column(d, 0) {
		if v < 0 {
			t.Errorf("a birth rate of %v", v)
		}
	}
	if len(d.Warnings) != 1 || d.Warnings[0].Key != "births.rate" || !strings.Contains(d.Warnings[0].Text, "16 %") {
		t.Errorf("warnings %v", d.Warnings)
	}
}

// TestRedraw: drawing one draw anew changes that draw alone, again and again to
// other values, follows the laws and correlations, and ends.
func TestRedraw(t *testing.T) {
	laws := []uncertain{around("births.rate", "normal", 0.3), around("start.abundance", "uniform", 10)}
	pairs := []pair{{"births.rate", "start.abundance", 0.8}}
	c := goats(t, 9, 2000, laws, pairs)
	d, e := design(t, c), design(t, c)
	was := d.Redrawn()
	for i := 0; i < d.Draws(); i += 2 {
		before := append([]float64(nil), d.Values(i)...)
		if err := d.Redraw(i); err != nil {
			t.Fatal(err)
		}
		if d.Values(i)[0] == before[0] || d.Values(i)[1] == before[1] {
			t.Fatalf("draw %d keeps a value of %v: %v", i, before, d.Values(i))
		}
	}
	var x, y []float64
	for i := 0; i < d.Draws(); i += 2 {
		x, y = append(x, d.Values(i)[0]), append(y, d.Values(i)[1])
		if d.Values(i + 1)[0] != e.Values(i + 1)[0] {
			t.Fatalf("draw %d was not drawn anew and has changed", i+1)
		}
	}
	if d.Redrawn() <= was || d.Redrawn() < d.Draws()/2 {
		t.Errorf("%d of %d draws are counted as drawn anew", d.Redrawn(), d.Draws())
	}
	law := distuv.Normal{Mu: 0.3, Sigma: 0.3}
	cut := func(x float64) float64 { return (law.CDF(x) - law.CDF(0)) / (1 - law.CDF(0)) }
	if k := distance(x, cut); k > limit(len(x)) {
		t.Errorf("distance of redrawn values from the law: %v, at most %v", k, limit(len(x)))
	}
	// The variance of a rank correlation r of n normal pairs is below (1 - r²)²
	// 1.06/(n-3) times 1.5 at r = 0.8 (Bonett & Wright 2000, Psychometrika 65:23:
	// (1 + r²/2)/(n-3) on Fisher's scale).
	got := math.Atanh(spearman(x, y))
	if within := z * math.Sqrt((1+0.32)/float64(len(x)-3)); math.Abs(got-math.Atanh(0.8)) > within {
		t.Errorf("rank correlation of redrawn values %v, want 0.8", math.Tanh(got))
	}
	tries := 0
	for d.Redraw(1) == nil {
		if tries++; tries > 10*mostTries {
			t.Fatal("redrawing never ends")
		}
	}
	if tries != mostTries {
		t.Errorf("given up after %d tries", tries)
	}
}

// TestRefused lists laws that their figures or their keys do not allow.
func TestRefused(t *testing.T) {
	for _, c := range []struct {
		law  uncertain
		want string
	}{
		{uncertain{"births.rate", "lognormal", none, 0, 0.5, none}, "uncertain.1.low: 0 is not above 0"},
		{uncertain{"births.rate", "triangular", none, 0.4, 0.6, none}, "uncertain.1.mode: is needed"},
		{uncertain{"births.rate", "beta", none, 0.4, 0.6, none}, "uncertain.1.low: 0.4 to high leave out the case's value 0.3"},
		{uncertain{"births.trend", "lognormal", 0.3, none, none, none}, ""},
		{uncertain{"deaths.fraction", "uniform", 5, none, none, none}, "uncertain.1.law: \"uniform\" lies for the most part (94 %) outside"},
	} {
		_, err := New(goats(t, 1, 10, []uncertain{c.law}, nil))
		if c.want == "" && err != nil || c.want != "" && (err == nil || !strings.Contains(err.Error(), c.want)) {
			t.Errorf("%v: %v, want %q", c.law, err, c.want)
		}
	}
}

// TestBesideTheValue: a law that does not hold the value of the case is warned of.
func TestBesideTheValue(t *testing.T) {
	d := design(t, goats(t, 1, 10, []uncertain{{"births.rate", "uniform", none, 0.4, 0.5, none}, {"deaths.fraction", "uniform", none, 0.1, 0.2, none}}, nil))
	if len(d.Warnings) != 1 || d.Warnings[0].Key != "births.rate" || !strings.Contains(d.Warnings[0].Text, "beside the value") {
		t.Errorf("warnings %v", d.Warnings)
	}
}

// TestGolden pins a small design: draws are part of the result of a run. Do not
// change the figures; a change of them is a change of every such run.
func TestGolden(t *testing.T) {
	laws := []uncertain{around("births.rate", "normal", 0.02), {"births.crowding.capacity", "uniform", none, 120, 160, none}}
	pairs := []pair{{"births.rate", "births.crowding.capacity", 0.5}}
	d := design(t, goats(t, 20270101, 4, laws, pairs))
	again := design(t, goats(t, 20270101, 4, laws, pairs))
	other := design(t, goats(t, 20270102, 4, laws, pairs))
	want := [][2]float64{{0.2973933981, 159.5890482}, {0.3092431609, 128.3282078}, {0.2864519453, 131.694979}, {0.3181055942, 141.5463378}}
	same := 0
	for i := range 4 {
		got := [2]float64{d.Values(i)[0], d.Values(i)[1]}
		if i >= len(want) || got != want[i] {
			t.Errorf("draw %d is %v", i, got)
		}
		if again.Values(i)[0] != got[0] || again.Values(i)[1] != got[1] {
			t.Errorf("draw %d is not the same again", i)
		}
		if other.Values(i)[0] == got[0] {
			same++
		}
		if s := d.Settings(i); s[0].Path != "births.rate" || s[0].Value.Num != got[0] || s[1].Path != "births.crowding.capacity" || s[1].Value.Num != got[1] {
			t.Errorf("settings %v", s)
		}
	}
	if same > 0 {
		t.Errorf("%d of 4 draws are the same with another seed", same)
	}
}
