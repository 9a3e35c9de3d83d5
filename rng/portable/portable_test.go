package portable

import (
	"math"
	"math/big"
	"math/rand/v2"
	"testing"
)

// accuracy draws n arguments and holds the error in units of the last place to
// a limit; it fails from an error of one rounding more than the documented one.
func accuracy(t *testing.T, limit float64, n int, arg func(*rand.Rand) float64, got func(float64) float64, want func(*big.Float) *big.Float) {
	t.Helper()
	r := rand.New(rand.NewPCG(11, 12))
	worst, at := 0.0, 0.0
	for range n {
		x := arg(r)
		if u := ulps(got(x), want(bigOf(x))); !(u <= worst) {
			worst, at = u, x
		}
	}
	t.Logf("worst error %.3f units of the last place, at %v", worst, at)
	if !(worst <= limit) {
		t.Errorf("error %.3f units of the last place at %v, limit %v", worst, at, limit)
	}
}

func spread(low, high float64) func(*rand.Rand) float64 {
	return func(r *rand.Rand) float64 { return low + (high-low)*r.Float64() }
}

// powers spreads the exponent evenly, either sign.
func powers(low, high float64) func(*rand.Rand) float64 {
	return func(r *rand.Rand) float64 {
		x := math.Exp2(low + (high-low)*r.Float64())
		if r.IntN(2) == 0 {
			return -x
		}
		return x
	}
}

func positive(f func(*rand.Rand) float64) func(*rand.Rand) float64 {
	return func(r *rand.Rand) float64 { return math.Abs(f(r)) }
}

func TestExpAccuracy(t *testing.T) {
	accuracy(t, 0.52, 4000, spread(-690, 709), Exp, bigExp)
	accuracy(t, 0.52, 4000, spread(-1, 1), Exp, bigExp)
	accuracy(t, 0.52, 3000, powers(-60, 3), Exp, bigExp)
	accuracy(t, 1, 3000, spread(-745.13, -690), Exp, bigExp) // two roundings
	accuracy(t, 1, 3000, spread(709, 709.78), Exp, bigExp)
}

func TestExpm1Accuracy(t *testing.T) {
	want := func(x *big.Float) *big.Float { y := bigExp(x); return y.Sub(y, bigOf(1)) }
	accuracy(t, 2, 4000, spread(-41, 41), Expm1, want)
	accuracy(t, 2, 4000, spread(-0.7, 0.7), Expm1, want)
	accuracy(t, 2, 4000, spread(-0.02, 0.02), Expm1, want)
	accuracy(t, 2, 3000, powers(-80, 3), Expm1, want)
}

func TestLogAccuracy(t *testing.T) {
	accuracy(t, 1, 800, positive(powers(-1074, 1023)), Log, bigLog)
	accuracy(t, 1, 800, spread(0.5, 2), Log, bigLog)
	accuracy(t, 1, 800, spread(0.99, 1.01), Log, bigLog)
	accuracy(t, 1, 800, func(r *rand.Rand) float64 { return 1 + powers(-53, -7)(r) }, Log, bigLog)
}

func TestLog1pAccuracy(t *testing.T) {
	want := func(x *big.Float) *big.Float { return bigLog(newBig().Add(x, bigOf(1))) }
	accuracy(t, 2, 600, spread(-0.999, 1), Log1p, want)
	accuracy(t, 2, 600, powers(-80, -1), Log1p, want)
	accuracy(t, 2, 500, positive(powers(-1, 100)), Log1p, want)
}

func TestPowAccuracy(t *testing.T) {
	r := rand.New(rand.NewPCG(13, 14))
	worst := 0.0
	for range 1500 {
		x := positive(powers(-40, 40))(r)
		if r.IntN(2) == 0 {
			x = spread(0.5, 2)(r)
		}
		y := powers(-10, 4)(r)
		if r.IntN(4) == 0 {
			y = spread(-1000, 1000)(r) / math.Log(x)
			if !(math.Abs(y*math.Log(x)) < 700) {
				continue
			}
		}
		want := bigExp(newBig().Mul(bigLog(bigOf(x)), bigOf(y)))
		if u := ulps(Pow(x, y), want); !(u <= worst) {
			worst = u
			if !(u <= 1) {
				t.Fatalf("Pow(%v, %v): error %.3f units of the last place", x, y, u)
			}
		}
	}
	t.Logf("worst error %.3f units of the last place", worst)
}

func TestSinTurnsAccuracy(t *testing.T) {
	want := func(x *big.Float) *big.Float {
		y := newBig().Mul(x, bigPiValue)
		return bigSin(y.Mul(y, bigOf(2)))
	}
	accuracy(t, 1, 2000, spread(-2, 2), SinTurns, want)
	accuracy(t, 1, 1000, powers(-60, -2), SinTurns, want)
	accuracy(t, 1, 1000, func(r *rand.Rand) float64 { return 0.5 + powers(-40, -3)(r) }, SinTurns, want)
	// whole turns drop out exactly
	for _, turns := range []float64{1, 1024, 0x1p40, -0x1p40} {
		for _, x := range []float64{0, 0.125, 0.25, 0.5, 0.75, 1.0 / 16} {
			if got, want := SinTurns(turns+x), SinTurns(x); got != want {
				t.Errorf("SinTurns(%v + %v) = %v, want %v", turns, x, got, want)
			}
		}
	}
}

// 1/(1+e^-x) differentiates the error of Exp away; three roundings are left.
func TestLogisticAccuracy(t *testing.T) {
	want := func(x *big.Float) *big.Float {
		y := bigExp(newBig().Neg(x))
		return y.Quo(bigOf(1), y.Add(y, bigOf(1)))
	}
	accuracy(t, 2, 4000, spread(-700, 40), Logistic, want)
	accuracy(t, 2, 3000, spread(-5, 5), Logistic, want)
}

func TestTables(t *testing.T) {
	for i, e := range expTable {
		want := bigExp(newBig().Quo(newBig().Mul(bigLn2Value, bigOf(float64(i))), bigOf(expSize)))
		top, _ := want.Float64()
		if got := math.Float64frombits(e.bits + uint64(i)<<45); got != top {
			t.Errorf("2^(%d/128) = %v, want %v", i, got, top)
		}
		rest := newBig().Sub(want, bigOf(top))
		rest.Quo(rest, want)
		if f, _ := rest.Float64(); math.Abs(f-e.tail) > 0x1p-100 {
			t.Errorf("tail of 2^(%d/128) = %v, want %v", i, e.tail, f)
		}
	}
	for i, e := range logTable {
		want := newBig().Neg(bigLog(bigOf(e.c)))
		if e.hi*0x1p42 != math.Floor(e.hi*0x1p42) {
			t.Errorf("the high part %v of ln(1/%v) is not a multiple of 2^-42", e.hi, e.c)
		}
		rest := newBig().Sub(want, bigOf(e.hi))
		if f, _ := rest.Float64(); math.Abs(f-e.lo) > 0x1p-90 {
			t.Errorf("low part of ln(1/%v), cell %d, = %v, want %v", e.c, i, e.lo, f)
		}
		from := math.Float64frombits(logFrom + uint64(i)<<45)
		to := math.Float64frombits(logFrom + uint64(i+1)<<45)
		if r := math.Max(math.Abs(from*e.c-1), math.Abs(to*e.c-1)); r > 1.0/128 {
			t.Errorf("cell %d reaches %v from 1, the series holds to 1/128", i, r)
		}
	}
	if ln2Top*0x1p42 != math.Floor(ln2Top*0x1p42) || math.Float64bits(stepHi)&(1<<19-1) != 0 {
		t.Error("the high parts of ln 2 have too many bits")
	}
}

func TestSpecialValues(t *testing.T) {
	inf, nan := math.Inf(1), math.NaN()
	edges := []float64{0, math.Copysign(0, -1), 1, -1, 2, 0.5, inf, -inf, nan, math.MaxFloat64, -math.MaxFloat64,
		math.SmallestNonzeroFloat64, -math.SmallestNonzeroFloat64, 0x1p-1022, -0x1p-1022, 710, -746, 1e300, 1e-300}
	same := func(a, b float64) bool { return a == b || a != a && b != b }
	near := func(a, b float64) bool { return same(a, b) || math.Abs(a-b) <= 4e-16*math.Abs(b) }
	for _, x := range edges {
		for _, f := range []struct {
			name      string
			got, want float64
		}{
			{"Exp", Exp(x), math.Exp(x)},
			{"Expm1", Expm1(x), math.Expm1(x)},
			{"Log", Log(x), trueLog(x)},
			{"Log1p", Log1p(x), math.Log1p(x)},
		} {
			if !near(f.got, f.want) {
				t.Errorf("%s(%v) = %v, package math has %v", f.name, x, f.got, f.want)
			}
		}
		for _, y := range edges {
			want := math.Pow(x, y)
			if x < 0 && y != 0 {
				want = nan
			}
			if x == 0 {
				want = math.Pow(0, y) // no sign of zero
			}
			if !near(Pow(x, y), want) {
				t.Errorf("Pow(%v, %v) = %v, want %v", x, y, Pow(x, y), want)
			}
		}
	}
	for _, x := range []float64{inf, -inf, nan} {
		if got := SinTurns(x); got == got {
			t.Errorf("SinTurns(%v) = %v, want NaN", x, got)
		}
	}
	for i, want := range []float64{0, 1, 0, -1, 0, 1} {
		if got := SinTurns(float64(i) / 4); got != want || math.Signbit(got) != (want < 0) {
			t.Errorf("SinTurns(%d/4) = %v, want %v", i, got, want)
		}
	}
	for _, c := range []struct{ x, want float64 }{{0, 0.5}, {inf, 1}, {-inf, 0}, {800, 1}, {-800, 0}, {nan, nan}} {
		if got := Logistic(c.x); !same(got, c.want) {
			t.Errorf("Logistic(%v) = %v, want %v", c.x, got, c.want)
		}
	}
	if Exp(0) != 1 || Exp(1) != math.E || Log(1) != 0 || Pow(3, 2) != 9 || Pow(2, 0.5) != math.Sqrt2 {
		t.Error("Exp(0), Exp(1), Log(1), Pow(3, 2) or Pow(2, 0.5) is not the nearest double")
	}
}

// trueLog is math.Log, but by the reference for subnormal x: math.Log of Go 1.26
// on amd64 takes their leading zeros for digits (it has -709.09 for 5e-324,
// where -744.44 is right).
func trueLog(x float64) float64 {
	if x > 0 && x < 0x1p-1022 {
		f, _ := bigLog(bigOf(x)).Float64()
		return f
	}
	return math.Log(x)
}

// No function may step back where the true one rises.
func TestMonotone(t *testing.T) {
	for _, f := range []func(float64) float64{Exp, Log, Expm1, Log1p, Logistic} {
		for _, x := range []float64{0.0027, 0.1, 0.703125, 0.9999, 1, 1.0078125, 1.40625, 3, 17} {
			last := f(x)
			for range 2000 {
				x = x * (1 + 0x1p-45)
				y := f(x)
				if y < last {
					t.Fatalf("falls at %v: %v after %v", x, y, last)
				}
				last = y
			}
		}
	}
}

// The bits of 200,000 values of all functions, one after another, in one sum:
// the promise of the package. amd64 without fused multiply-add and arm64 with it
// gave this sum.
func TestSameBitsEverywhere(t *testing.T) {
	r := rand.New(rand.NewPCG(15, 16))
	sum := uint64(14695981039346656037) // FNV-1a, 64 bits at a time
	put := func(x float64) { sum = (sum ^ math.Float64bits(x)) * 1099511628211 }
	for range 15000 {
		x := float64(int64(r.Uint64())) * 0x1p-54 // -512 to 512
		u := float64(r.Uint64()>>11) * 0x1p-53
		put(Exp(x))
		put(Expm1(u - 0.5))
		put(Log(u * 100))
		put(Log1p(u - 0.5))
		put(Pow(u*4, x/100))
		put(SinTurns(x))
		put(Logistic(x / 50))
		put(Exp(-700 - float64(u*45)))
	}
	if want := uint64(0x19fbe710b1118b05); sum != want {
		t.Errorf("sum of the bits %#x, want %#x", sum, want)
	}
}

var sink float64

// Each beside package math, in one run.
func Benchmark(b *testing.B) {
	for _, f := range []struct {
		name string
		f    func(float64) float64
	}{
		{"Exp", Exp}, {"Exp-math", math.Exp}, {"Log", Log}, {"Log-math", math.Log},
		{"Log1p", Log1p}, {"Log1p-math", math.Log1p}, {"Expm1", Expm1}, {"Expm1-math", math.Expm1},
		{"Pow", func(x float64) float64 { return Pow(x, 1.3) }}, {"Pow-math", func(x float64) float64 { return math.Pow(x, 1.3) }},
		{"SinTurns", SinTurns}, {"Sin-math", func(x float64) float64 { return math.Sin(2 * math.Pi * x) }}, {"Logistic", Logistic},
	} {
		b.Run(f.name, func(b *testing.B) {
			x := 0.3
			for b.Loop() {
				sink += f.f(x)
				x += 1e-7
			}
		})
	}
}
