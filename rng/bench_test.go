package rng

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
)

// Each sampler beside gonum's on the same stream: compare the two lines of one
// run, not single times. Both get their parameters anew at every draw.
var (
	sinkInt   int64
	sinkFloat float64
)

func BenchmarkBinomial(b *testing.B) {
	for _, c := range []struct {
		n int64
		p float64
	}{{5, 0.3}, {50, 0.3}, {64, 0.8}, {200, 0.8}, {256, 0.3}, {400, 0.03}, {400, 0.3}, {1000, 0.3}, {4096, 0.3}, {100000, 1e-5}, {1 << 33, 0.3}} {
		b.Run(fmt.Sprintf("n=%d,p=%v/ebbline", c.n, c.p), func(b *testing.B) {
			s := NewStream(1, 0, Demography)
			for b.Loop() {
				sinkInt += Binomial(s, c.n, c.p)
			}
		})
		b.Run(fmt.Sprintf("n=%d,p=%v/gonum", c.n, c.p), func(b *testing.B) {
			s := NewStream(1, 0, Demography)
			for b.Loop() {
				sinkFloat += distuv.Binomial{N: float64(c.n), P: c.p, Src: s}.Rand()
			}
		})
	}
}

// The ways of Binomial against each other, to place the crossing.
func BenchmarkBinomialWays(b *testing.B) {
	for _, n := range []int64{64, 128, 255, 256, 300, 447, 511, 700, 1000, 1500, 2000, 4000} {
		for _, p := range []float64{0.05, 0.3} {
			b.Run(fmt.Sprintf("n=%d,p=%v/digits", n, p), func(b *testing.B) {
				s := NewStream(1, 0, Demography)
				for b.Loop() {
					sinkInt += binomialDigits(s, n, p)
				}
			})
			b.Run(fmt.Sprintf("n=%d,p=%v/many", n, p), func(b *testing.B) {
				s := NewStream(1, 0, Demography)
				for b.Loop() {
					sinkInt += binomialMany(s, n, p)
				}
			})
		}
	}
}

func BenchmarkPoisson(b *testing.B) {
	for _, m := range []float64{0.02, 0.9, 7.5, 15.3, 90.2, 150.3, 500.3, 1000.3, 2000, 1e5, 1e9} {
		b.Run(fmt.Sprintf("mean=%v/ebbline", m), func(b *testing.B) {
			s := NewStream(1, 0, Demography)
			for b.Loop() {
				sinkInt += Poisson(s, m)
			}
		})
		b.Run(fmt.Sprintf("mean=%v/gonum", m), func(b *testing.B) {
			s := NewStream(1, 0, Demography)
			for b.Loop() {
				sinkFloat += distuv.Poisson{Lambda: m, Src: s}.Rand()
			}
		})
	}
}

// The ways of Poisson against each other, to place the crossing.
func BenchmarkPoissonWays(b *testing.B) {
	for _, m := range []float64{300.3, 700.3, 1000.3, 1500.3, 2000.3} {
		b.Run(fmt.Sprintf("mean=%v/parts", m), func(b *testing.B) {
			s := NewStream(1, 0, Demography)
			for b.Loop() {
				sinkInt += poissonParts(s, m)
			}
		})
		b.Run(fmt.Sprintf("mean=%v/reject", m), func(b *testing.B) {
			s := NewStream(1, 0, Demography)
			for b.Loop() {
				sinkFloat += poissonReject(s, m)
			}
		})
	}
}

func BenchmarkNegativeBinomial(b *testing.B) {
	for _, c := range []struct{ mean, size float64 }{{1.5, 0.5}, {90, 40}, {2000, 3.3}} {
		b.Run(fmt.Sprintf("mean=%v,size=%v/ebbline", c.mean, c.size), func(b *testing.B) {
			s := NewStream(1, 0, Demography)
			for b.Loop() {
				sinkInt += NegativeBinomial(s, c.mean, c.size)
			}
		})
		b.Run(fmt.Sprintf("mean=%v,size=%v/gonum", c.mean, c.size), func(b *testing.B) { // gonum has Gamma and Poisson
			s := NewStream(1, 0, Demography)
			for b.Loop() {
				m := distuv.Gamma{Alpha: c.size, Beta: c.size / c.mean, Src: s}.Rand()
				sinkFloat += distuv.Poisson{Lambda: m, Src: s}.Rand()
			}
		})
	}
}

func BenchmarkBirthGeometrics(b *testing.B) {
	for _, c := range []struct {
		k    int64
		beta float64
	}{{50, 0.03}, {200, 0.03}, {200, 0.3}, {590, 0.03}, {590, 0.3}, {590, 0.5}, {5000, 0.03}, {5000, 0.3}} {
		b.Run(fmt.Sprintf("k=%d,beta=%v/ebbline", c.k, c.beta), func(b *testing.B) {
			s := NewStream(1, 0, Demography)
			for b.Loop() {
				sinkInt += BirthGeometrics(s, c.k, c.beta)
			}
		})
		b.Run(fmt.Sprintf("k=%d,beta=%v/chain", c.k, c.beta), func(b *testing.B) {
			s := NewStream(1, 0, Demography)
			for b.Loop() {
				for k := c.k; k > 0; sinkInt += k {
					k = Binomial(s, k, c.beta)
				}
			}
		})
		b.Run(fmt.Sprintf("k=%d,beta=%v/gonum", c.k, c.beta), func(b *testing.B) { // the chain by gonum's binomial
			s := NewStream(1, 0, Demography)
			for b.Loop() {
				for k := float64(c.k); k > 0; sinkFloat += k {
					k = distuv.Binomial{N: k, P: c.beta, Src: s}.Rand()
				}
			}
		})
	}
}

func BenchmarkContinuous(b *testing.B) {
	s := NewStream(1, 0, Weather)
	b.Run("normal/ebbline", func(b *testing.B) {
		for b.Loop() {
			sinkFloat += Normal(s)
		}
	})
	b.Run("normal/gonum", func(b *testing.B) {
		for b.Loop() {
			sinkFloat += distuv.Normal{Sigma: 1, Src: s}.Rand()
		}
	})
	b.Run("exponential/ebbline", func(b *testing.B) {
		for b.Loop() {
			sinkFloat += Exponential(s)
		}
	})
	b.Run("exponential/gonum", func(b *testing.B) {
		for b.Loop() {
			sinkFloat += distuv.Exponential{Rate: 1, Src: s}.Rand()
		}
	})
	b.Run("gamma/ebbline", func(b *testing.B) {
		for b.Loop() {
			sinkFloat += Gamma(s, 3.3)
		}
	})
	b.Run("gamma/gonum", func(b *testing.B) {
		for b.Loop() {
			sinkFloat += distuv.Gamma{Alpha: 3.3, Beta: 1, Src: s}.Rand()
		}
	})
	b.Run("float64/ebbline", func(b *testing.B) {
		for b.Loop() {
			sinkFloat += s.Float64()
		}
	})
	b.Run("word/ebbline", func(b *testing.B) {
		for b.Loop() {
			sinkInt += int64(s.Uint64())
		}
	})
	b.Run("round/ebbline", func(b *testing.B) {
		for b.Loop() {
			sinkInt += Round(s, 15.3)
		}
	})
}

func BenchmarkSeed(b *testing.B) {
	var s Stream
	i := uint64(0)
	for b.Loop() {
		s.Seed(1, i, Demography)
		i++
	}
	sinkInt = int64(s.Uint64())
}

// What the package does before main.
func BenchmarkTables(b *testing.B) {
	for b.Loop() {
		half, _ := buildHalfTables()
		sinkInt += buildPoissonCoarse()[3].draw(5) + buildPoissonFine()[3].draw(5) + half[3].draw(4)
		sinkFloat += buildStirlingTable()[3] + math.Abs(1)
	}
}
