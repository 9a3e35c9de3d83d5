package exact

import (
	"flag"
	"math"
	"testing"

	"ebbline/pva/rates"

	"gonum.org/v1/gonum/stat/distuv"
)

var long = flag.Bool("long", false, "also run the checks that take minutes")

// The rational approximation is within 3e-16 of the exponential on the
// negative real axis (Pusa 2016); double arithmetic of its eight factors adds
// some units of 1e-15.
func TestRationalApproximation(t *testing.T) {
	for k := -400; k <= 500; k++ {
		x := -math.Pow(10, float64(k)/100)
		y := complex(cramLimit, 0)
		for l, theta := range cramPoles {
			y *= complex(1+2*real(cramResidues[l]/(complex(x, 0)-theta)), 0)
		}
		if diff := math.Abs(real(y) - math.Exp(x)); !(diff < 2e-14) {
			t.Fatalf("exp(%g): off by %.2g", x, diff)
		}
	}
}

// The two ways to move a law through a flow year share nothing. With the bound
// used, the rational approximation must stay within 1e-10 of uniformisation,
// whose only error is a cut tail, also where drift outweighs noise.
func TestRationalAgainstUniformisation(t *testing.T) {
	type chain struct {
		birth, death, capacity, take float64
		top, start                   int
	}
	chains := []chain{
		{0.3, 0.2, 0, 0, 500, 30}, {0.5, 0.3, 100, 0, 300, 100}, {0.5, 0.3, 100, 5, 300, 20}, {0, 0.5, 0, 0, 300, 300},
		{0.5, 0, 0, 0, 400, 100}, {0, 0, 0, 60, 300, 200}, {2, 0.2, 150, 0, 400, 5}, {0.2, 2, 0, 0, 300, 250}, {0.01, 0.01, 0, 0, 50, 3},
	}
	if *long {
		chains = append(chains, chain{0.5, 0.4, 0, 0, 2000, 1000}, chain{0.5, 0.3, 1000, 0, 2500, 300}, chain{5, 1, 1000, 0, 2000, 20}, chain{0.3, 3, 0, 0, 2000, 1500})
	}
	for _, c := range chains {
		g := birthDeath{make([]float64, c.top+1), make([]float64, c.top+1)}
		for i := 1; i <= c.top; i++ {
			n := float64(i)
			g.up[i], g.down[i] = c.birth*n, c.death*n+c.take
			if c.capacity > 0 {
				g.down[i] += (c.birth - c.death) * n * n / c.capacity
			}
		}
		for _, test := range []struct{ bound, most float64 }{{4, 1e-10}, {6, 1e-9}} {
			vs := newBatch(2, c.top+1)
			vs[0][c.start], vs[1][c.start] = 1, 1
			newUniform(g).move(vs[:1])
			newPropagator(g, g.stepsFor(test.bound)).move(vs[1:])
			off, mass := 0.0, 0.0
			for i := range vs[0] {
				off += math.Abs(vs[0][i] - vs[1][i])
				mass += vs[0][i]
			}
			if !(off < test.most) {
				t.Errorf("%+v, bound %v: %.2g apart", c, test.bound, off)
			}
			if !(math.Abs(mass-1) < 1e-12) { // rounding of some thousand jumps
				t.Errorf("%+v: mass %.17g", c, mass)
			}
		}
	}
}

// A linear chain has a closed law (Kendall 1948, Ann. Math. Statist. 19:1-15):
// from one animal, P(0) = alpha and P(n) = (1-alpha)(1-beta) beta^(n-1).
func TestUniformisationAgainstKendall(t *testing.T) {
	b, d := 0.7, 0.4
	g := birthDeath{make([]float64, 201), make([]float64, 201)}
	for i := range g.up {
		g.up[i], g.down[i] = b*float64(i), d*float64(i)
	}
	v := newBatch(1, 201)
	v[0][1] = 1
	newUniform(g).move(v)
	e := math.Exp(b - d)
	alpha, beta := d*(e-1)/(b*e-d), b*(e-1)/(b*e-d)
	for n := 0; n < 40; n++ {
		want := alpha
		if n > 0 {
			want = (1 - alpha) * (1 - beta) * math.Pow(beta, float64(n-1))
		}
		if !(math.Abs(v[0][n]-want) < 1e-14) {
			t.Errorf("P(%d): %.16g, formula %.16g", n, v[0][n], want)
		}
	}
}

// Every row of a year's kernels is a law: not below 0, of sum 1 with what goes
// beyond the top, to the rounding of a sum of a thousand terms; and it has the
// mean of the model.
func TestRowsAreLaws(t *testing.T) {
	m := model(t, pulse(50, 5, 10, 0.5, 0.3).with(set{"births.year_sd": 0.15, "deaths.year_sd": 0.1, "births.crowding.form": "ricker", "births.crowding.scale": 200}))
	r := newRun(m, setting{top: 120, order: 20, keep: true})
	lives, young := newKernel(120, true, r.lifeLaws(1)[0]), newKernel(120, true, grownLaw(r.youngLaws(1)[0]))
	for n := 0; n <= 120; n++ {
		for i, k := range []*kernel{lives, young} {
			lo, row, over, _ := k.row(n, nil)
			sum, mean := over, 0.0
			for j, p := range row {
				if p < 0 {
					t.Fatalf("kernel %d, row %d: %g at %d", i, n, p, lo+j)
				}
				sum += p
				mean += p * float64(lo+j)
			}
			if !(math.Abs(sum-1) < 1e-13) {
				t.Errorf("kernel %d, row %d: sum %.16g", i, n, sum)
			}
			want := 0.7 * float64(n)
			if i == 1 {
				want = float64(n) * (1 + 0.5*math.Exp(-float64(n)/200))
			}
			if over < 1e-15 && !(math.Abs(mean-want) < 1e-9*(1+want)) {
				t.Errorf("kernel %d, row %d: mean %.12g, model %.12g", i, n, mean, want)
			}
		}
	}
}

func TestLawsAgainstGonum(t *testing.T) {
	near := func(what string, k int, got, want float64) {
		// gonum's laws go through logarithms of factorials: 1e-12 of each value.
		if !(math.Abs(got-want) < 1e-12) {
			t.Errorf("%s at %d: %.15g, gonum %.15g", what, k, got, want)
		}
	}
	for _, p := range []float64{0.01, 0.4, 0.97} {
		for _, n := range []int{1, 17, 600} {
			lo, row := binomial(nil, n, p)
			for i, v := range row {
				near("binomial", lo+i, v, distuv.Binomial{N: float64(n), P: p}.Prob(float64(lo+i)))
			}
		}
	}
	for _, mean := range []float64{0.03, 4.2, 900} {
		lo, row := poisson(nil, mean)
		for i, v := range row {
			near("Poisson", lo+i, v, distuv.Poisson{Lambda: mean}.Prob(float64(lo+i)))
		}
	}
	// Negative binomial: a Poisson law whose mean is gamma, here by its two moments.
	for _, size := range []float64{0.3, 2, 70} {
		lo, row := negBinomial(nil, 12, size)
		var sum, mean, second float64
		for i, v := range row {
			x := float64(lo + i)
			sum, mean, second = sum+v, mean+v*x, second+v*x*x
		}
		near("negative binomial sum", 0, sum, 1)
		if !(math.Abs(mean-12) < 1e-10) || !(math.Abs(second-mean*mean-12-144/size) < 1e-7) {
			t.Errorf("negative binomial of size %v: mean %.12g, variance %.12g", size, mean, second-mean*mean)
		}
	}
}

// Rounding at random keeps the mean, and the chance of k is the mean of the
// hat function at k, here by the trapezoid rule: its error across the bends is
// the square of its step.
func TestRoundedLogNormal(t *testing.T) {
	cv, mean := 0.35, 7.3
	f := factor{rates.NewLogNormal(1, cv).Sigma}
	law := make([]float64, 200)
	f.addRounded(law, 1, 0, mean, 0, math.Inf(1))
	sum, first := 0.0, 0.0
	for k, p := range law {
		sum += p
		first += p * float64(k)
	}
	if !(math.Abs(sum-1) < 1e-13) || !(math.Abs(first-mean) < 1e-12) {
		t.Errorf("sum %.16g, mean %.16g", sum, first)
	}
	for _, k := range []int{0, 1, 6, 7, 15} {
		want := 0.0
		averageOver(cv, 200001, 0, func(x, w float64) { want += w * math.Max(0, 1-math.Abs(mean*x-float64(k))) })
		if !(math.Abs(law[k]-want) < 1e-8) {
			t.Errorf("P(%d): %.12g, by quadrature %.12g", k, law[k], want)
		}
	}
	// A decreasing target, and one cut at the last entry.
	down := make([]float64, 30)
	f.addRounded(down, 1, 20, -mean, 0, 2)
	up := make([]float64, 5)
	f.addRounded(up, 1, 0, mean, 0, math.Inf(1))
	head := 0.0
	for _, p := range law[:4] {
		head += p
	}
	if !(math.Abs(up[4]-(1-head)) < 1e-13) {
		t.Errorf("cut at 4: %.15g, tail %.15g", up[4], 1-head)
	}
	for _, k := range []int{6, 12, 16} {
		want := 0.0
		averageOver(cv, 200001, 2, func(x, w float64) {
			if x <= 2 {
				want += w * math.Max(0, 1-math.Abs(20-mean*x-float64(k)))
			}
		})
		if !(math.Abs(down[k]-want) < 1e-7) {
			t.Errorf("decreasing, P(%d): %.12g, by quadrature %.12g", k, down[k], want)
		}
	}
}

// Given x a year ago the number is normal with mean memory x and variance
// 1 - memory^2: its first three moments are exact, being polynomials.
func TestMemoryMatrix(t *testing.T) {
	const a = 0.6
	r := gauss(9)
	k := mehler(r, a)
	for i, x := range r.at {
		var m [4]float64
		for j, y := range r.at {
			for d := range m {
				m[d] += k[i][j] * math.Pow(y, float64(d))
			}
		}
		v := 1 - a*a
		for d, want := range []float64{1, a * x, a*a*x*x + v, a*a*a*x*x*x + 3*a*x*v} {
			if !(math.Abs(m[d]-want) < 1e-11) {
				t.Errorf("moment %d from %.3g: %.14g, normal law %.14g", d, x, m[d], want)
			}
		}
	}
}
