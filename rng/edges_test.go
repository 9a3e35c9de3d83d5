package rng

import (
	"fmt"
	"math"
	"os/exec"
	"regexp"
	"strings"
	"testing"
)

// Degenerate laws are constants and use no words.
func TestDegenerateLawsAreConstants(t *testing.T) {
	for _, c := range []struct {
		name string
		draw func(*Stream) int64
		want int64
	}{
		{"Binomial(0, 0.3)", func(s *Stream) int64 { return Binomial(s, 0, 0.3) }, 0},
		{"Binomial(0, 0)", func(s *Stream) int64 { return Binomial(s, 0, 0) }, 0},
		{"Binomial(0, 1)", func(s *Stream) int64 { return Binomial(s, 0, 1) }, 0},
		{"Binomial(7, 0)", func(s *Stream) int64 { return Binomial(s, 7, 0) }, 0},
		{"Binomial(7, 1)", func(s *Stream) int64 { return Binomial(s, 7, 1) }, 7},
		{"Binomial(2^53, 0)", func(s *Stream) int64 { return Binomial(s, MaxTrials, 0) }, 0},
		{"Binomial(2^53, 1)", func(s *Stream) int64 { return Binomial(s, MaxTrials, 1) }, MaxTrials},
		{"Poisson(0)", func(s *Stream) int64 { return Poisson(s, 0) }, 0},
		{"NegativeBinomial(0, 1)", func(s *Stream) int64 { return NegativeBinomial(s, 0, 1) }, 0},
		{"BirthGeometrics(0, 0.5)", func(s *Stream) int64 { return BirthGeometrics(s, 0, 0.5) }, 0},
		{"BirthGeometrics(7, 0)", func(s *Stream) int64 { return BirthGeometrics(s, 7, 0) }, 0},
		{"Round(15)", func(s *Stream) int64 { return Round(s, 15) }, 15},
		{"Round(-15)", func(s *Stream) int64 { return Round(s, -15) }, -15},
		{"Round(0)", func(s *Stream) int64 { return Round(s, 0) }, 0},
		{"Round(2^53)", func(s *Stream) int64 { return Round(s, 0x1p53) }, 1 << 53},
		{"the zero BinomialLaw", BinomialLaw{}.Draw, 0},
		{"the zero PoissonLaw", PoissonLaw{}.Draw, 0},
		{"the zero NegativeBinomialLaw", NegativeBinomialLaw{}.Draw, 0},
	} {
		s := NewStream(1, 0, Demography)
		before := *s
		if got := c.draw(s); got != c.want {
			t.Errorf("%s = %d, want %d", c.name, got, c.want)
		}
		if *s != before {
			t.Errorf("%s used words of its stream", c.name)
		}
	}
}

// Extreme parameters end, and stay in the range of the law.
func TestExtremeParametersEnd(t *testing.T) {
	s := NewStream(2, 0, Demography)
	for _, n := range []int64{1, 6, 7, 64, 65, 511, 512, 1 << 20, 1 << 53} {
		for _, p := range []float64{math.SmallestNonzeroFloat64, 0x1p-1022, 1e-300, 1e-17, 0x1p-53, 0x1p-12, 0x1p-11, 0.25, 0.5, 1 - 0x1p-53} {
			for range 200 {
				k := Binomial(s, n, p)
				far := 20*math.Sqrt(float64(n)*p*(1-p)) + 40
				if k < 0 || k > n || math.Abs(float64(k)-float64(n)*p) > far {
					t.Fatalf("Binomial(%d, %v) = %d", n, p, k)
				}
			}
		}
	}
	for _, m := range []float64{math.SmallestNonzeroFloat64, 1e-300, 1e-17, 0x1p-4, 127.999, 1024, 1e12, MaxMean} {
		for range 200 {
			if k := Poisson(s, m); k < 0 || math.Abs(float64(k)-m) > 20*math.Sqrt(m)+40 {
				t.Fatalf("Poisson(%v) = %d", m, k)
			}
		}
	}
	for _, size := range []float64{1e-6, 1e-3, 1, 1e12} {
		for _, m := range []float64{math.SmallestNonzeroFloat64, 1e-17, 1, 1e12} {
			for range 2000 {
				if k := NegativeBinomial(s, m, size); k < 0 || k > MaxCount {
					t.Fatalf("NegativeBinomial(%v, %v) = %d", m, size, k)
				}
			}
		}
	}
	if k := BirthGeometrics(s, 1, math.SmallestNonzeroFloat64); k != 0 {
		t.Errorf("a geometric number of parameter 5e-324 = %d", k)
	}
	if k := Round(s, -1e-300); k != 0 && k != -1 {
		t.Errorf("Round(-1e-300) = %d", k)
	}
	if k := poissonAny(s, 1e19); k != MaxCount {
		t.Errorf("a Poisson mean of 1e19 gives %d, want the cut %d", k, int64(MaxCount))
	}
}

// Bad parameters are bugs of the caller, named in the message, and never loop.
func TestBadParametersPanic(t *testing.T) {
	s := NewStream(1, 0, Demography)
	nan, inf := math.NaN(), math.Inf(1)
	for _, c := range []struct {
		name string
		call func()
		want string
	}{
		{"p NaN", func() { Binomial(s, 100, nan) }, "NaN is not from 0 to 1"},
		{"p NaN, n 0", func() { Binomial(s, 0, nan) }, "NaN is not from 0 to 1"},
		{"p below", func() { Binomial(s, 10, -0.5) }, "-0.5 is not from 0 to 1"},
		{"p above", func() { Binomial(s, 10, 1.5) }, "1.5 is not from 0 to 1"},
		{"n below", func() { Binomial(s, -1, 0.5) }, "-1 is not from 0 to 2^53"},
		{"n above", func() { Binomial(s, MaxTrials+1, 0.5) }, "is not from 0 to 2^53"},
		{"mean NaN", func() { Poisson(s, nan) }, "mean NaN"},
		{"mean below", func() { Poisson(s, -1e-9) }, "mean -1e-09"},
		{"mean above", func() { Poisson(s, inf) }, "mean +Inf"},
		{"mean NaN", func() { NegativeBinomial(s, nan, 1) }, "mean NaN"},
		{"mean below", func() { NegativeBinomial(s, -1, 1) }, "mean -1"},
		{"size NaN", func() { NegativeBinomial(s, 1, nan) }, "size NaN"},
		{"size 0, mean 0", func() { NegativeBinomial(s, 0, 0) }, "size 0"},
		{"size above", func() { NegativeBinomial(s, 1, inf) }, "size +Inf"},
		{"beta NaN", func() { BirthGeometrics(s, 3, nan) }, "NaN is not from 0 to below 1"},
		{"beta 1", func() { BirthGeometrics(s, 3, 1) }, "1 is not from 0 to below 1"},
		{"beta below", func() { BirthGeometrics(s, 0, -0.1) }, "-0.1 is not from 0 to below 1"},
		{"k below", func() { BirthGeometrics(s, -3, 0.5) }, "-3 is not from 0 to 2^53"},
		{"sum too large", func() { BirthGeometrics(s, 1<<50, 0.9) }, "has a mean above 1e15"},
		{"shape 0", func() { Gamma(s, 0) }, "shape 0"},
		{"shape NaN", func() { Gamma(s, nan) }, "shape NaN"},
		{"round NaN", func() { Round(s, nan) }, "NaN can't be rounded"},
		{"round Inf", func() { Round(s, -inf) }, "-Inf can't be rounded"},
	} {
		func() {
			defer func() {
				if text := fmt.Sprint(recover()); !strings.HasPrefix(text, "rng: ") || !strings.Contains(text, c.want) {
					t.Errorf("%s: panics with %q, want %q in it", c.name, text, c.want)
				}
			}()
			c.call()
		}()
	}
}

func TestLawsRefuseBadParameters(t *testing.T) {
	nan := math.NaN()
	refuse := func(name string, err error, want string) {
		t.Helper()
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: error %v, want %q in it", name, err, want)
		}
	}
	_, err := NewBinomial(-1, 0.5)
	refuse("n", err, "-1 trials (want 0 to 2^53)")
	_, err = NewBinomial(5, nan)
	refuse("p", err, "NaN is not a chance (want 0 to 1)")
	_, err = NewBinomial(5, 1.2)
	refuse("p", err, "1.2 is not a chance (want 0 to 1)")
	_, err = NewPoisson(nan)
	refuse("mean", err, "mean NaN (want 0 to 1e15)")
	_, err = NewPoisson(-2)
	refuse("mean", err, "mean -2 (want 0 to 1e15)")
	_, err = NewNegativeBinomial(nan, 1)
	refuse("mean", err, "mean NaN (want 0 to 1e12)")
	_, err = NewNegativeBinomial(1, 0)
	refuse("size", err, "size 0 (want 1e-6 to 1e12)")
}

// A law draws as the function does, from the same words.
func TestLawsDrawAsTheFunctions(t *testing.T) {
	a, b := NewStream(1, 0, Demography), NewStream(1, 0, Demography)
	bin, err1 := NewBinomial(50, 0.3)
	poi, err2 := NewPoisson(7.5)
	neg, err3 := NewNegativeBinomial(7.5, 0.5)
	if err1 != nil || err2 != nil || err3 != nil {
		t.Fatal(err1, err2, err3)
	}
	for range 100 {
		if x, y := bin.Draw(a), Binomial(b, 50, 0.3); x != y {
			t.Fatalf("binomial law draws %d, the function %d", x, y)
		}
		if x, y := poi.Draw(a), Poisson(b, 7.5); x != y {
			t.Fatalf("Poisson law draws %d, the function %d", x, y)
		}
		if x, y := neg.Draw(a), NegativeBinomial(b, 7.5, 0.5); x != y {
			t.Fatalf("negative binomial law draws %d, the function %d", x, y)
		}
	}
}

func TestNothingAllocates(t *testing.T) {
	var s Stream
	i := uint64(0)
	n := testing.AllocsPerRun(2000, func() {
		s.Seed(1, i, Demography)
		i++
		sinkInt += Binomial(&s, 5, 0.3) + Binomial(&s, 300, 0.3) + Binomial(&s, 10, 0.01) + Binomial(&s, 100000, 0.3) + Binomial(&s, 1<<33, 1e-9)
		sinkInt += Poisson(&s, 0.02) + Poisson(&s, 500.3) + Poisson(&s, 1e5) + NegativeBinomial(&s, 5, 0.1) + BirthGeometrics(&s, 50, 0.03)
		sinkInt += Round(&s, 3.3)
		sinkFloat += Normal(&s) + Exponential(&s) + Gamma(&s, 0.5) + s.Float64()
	})
	if n != 0 {
		t.Errorf("%v allocations a round, want 0", n)
	}
}

// The compiler may fuse a product with a following sum into one rounding where
// the processor can. In these packages it finds nothing to fuse: the machine
// code for several processors has no such instruction.
func TestNothingIsFused(t *testing.T) {
	if !*long {
		t.Skip("compiles for other processors: -long")
	}
	fused := regexp.MustCompile(`\t(\S*F\S*M(ADD|SUB)\S*|WFM[AS]\S*)\t`)
	for _, target := range []string{"GOARCH=arm64", "GOARCH=ppc64le", "GOARCH=riscv64", "GOARCH=s390x", "GOAMD64=v3"} {
		cmd := exec.Command("go", "build", "-gcflags=ebbline/rng/...=-S", "ebbline/rng/...")
		cmd.Env = append(cmd.Environ(), target)
		out, err := cmd.CombinedOutput()
		if err != nil {
			t.Fatalf("%s: %v\n%s", target, err, out)
		}
		if !strings.Contains(string(out), "portable.Exp STEXT") {
			t.Fatalf("%s: no machine code in the output", target)
		}
		for line := range strings.Lines(string(out)) {
			if fused.MatchString(line) {
				t.Errorf("%s: %s", target, strings.TrimSpace(line))
			}
		}
	}
}
