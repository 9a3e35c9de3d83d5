package year

import (
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"testing"

	"ebbline/pva"
	"ebbline/pva/casefile"
	"ebbline/pva/ensemble"
	"ebbline/pva/plain"
	"ebbline/pva/rates"
	"ebbline/rng"

	"gonum.org/v1/gonum/stat/distuv"
)

// The workloads are case files, so that they can be timed as whole runs too.
// cpu-ns/unit is the processor time of a live replicate-year (of a live sub-step
// and of an event in the flow workloads): years of extinct replicates would
// flatter it.
// The yardstick is the same kernel on gonum's samplers, in the same run; plain is
// the plain simulator. Compare ratios, never absolute times.
//
//	go test ./pva/year -run xxx -bench . -count 6 -cpu 1

var workloads = []struct {
	name, file string
	// per is what the time is quoted for.
	per func(c *pva.Case, liveYears, events int64) int64
}{
	{"pulse", "pulse-large.toml", func(_ *pva.Case, years, _ int64) int64 { return years }},
	{"flow", "flow-large.toml", func(_ *pva.Case, years, _ int64) int64 { return 12 * years }},
	{"events", "events.toml", func(_ *pva.Case, _, events int64) int64 { return events }},
}

func workload(b testing.TB, file string) *rates.Model {
	b.Helper()
	data, err := os.ReadFile(filepath.Join("..", "..", "testdata", "cases", file))
	if err != nil {
		b.Fatal(err)
	}
	c, faults := casefile.Read(file, data)
	if len(faults) > 0 {
		b.Fatal(faults)
	}
	m, bad := rates.New(c)
	if len(bad) > 0 {
		b.Fatal(pva.Faults(bad))
	}
	return m
}

// live counts live replicate-years and, for event chains, expected events from
// the census: (b + d) N a year at the mean rates.
type live struct {
	m             *rates.Model
	chain         bool // count events too
	years, events int64
}

func (l *live) Census(_, _ int, row *ensemble.Row, _, _ uint64) {
	for i := 0; i < row.Lanes; i++ {
		if n := row.N[i]; n > 0 && row.Outgrown>>uint(i)&1 == 0 {
			l.years++
			if !l.chain {
				continue
			}
			at := float64(n)
			l.events += int64((l.m.BirthAt(l.m.Birth.Mean, at) + l.m.DeathAt(l.m.Death.Mean(), at)) * at)
		}
	}
}
func (l *live) Finish(int, *ensemble.End) {}

func BenchmarkYear(b *testing.B) {
	for _, w := range workloads {
		m := workload(b, w.file)
		b.Run(w.name+"/own", func(b *testing.B) { benchBlocks(b, m, w.per, func(*program) {}) })
		b.Run(w.name+"/gonum", func(b *testing.B) { benchBlocks(b, m, w.per, onGonum) })
		b.Run(w.name+"/plain", func(b *testing.B) {
			src := rand.NewPCG(1, 2)
			var years, events int64
			start := cpuTime()
			for i := 0; i < b.N; i++ {
				p, err := plain.Replicate(m.Case, src)
				if err != nil {
					b.Fatal(err)
				}
				for _, n := range p.N {
					if n > 0 {
						years++
						at := float64(n)
						events += int64((m.BirthAt(m.Birth.Mean, at) + m.DeathAt(m.Death.Mean(), at)) * at)
					}
				}
			}
			b.ReportMetric(float64((cpuTime()-start).Nanoseconds())/float64(max(1, w.per(m.Case, years, events))), "cpu-ns/unit")
		})
	}
}

func benchBlocks(b *testing.B, m *rates.Model, per func(*pva.Case, int64, int64) int64, change func(*program)) {
	e, err := New(1, m)
	if err != nil {
		b.Fatal(err)
	}
	change(e.programs[0])
	w := e.Worker()
	l := &live{m: m, chain: m.Case.Run.Substeps == "events"}
	b.ResetTimer()
	start := cpuTime()
	for i := 0; i < b.N; i++ {
		if err := w.Block(int64(i)*lanesMax, lanesMax, l); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64((cpuTime()-start).Nanoseconds())/float64(max(1, per(m.Case, l.years, l.events))), "cpu-ns/unit")
}

// onGonum puts passes with gonum's samplers in the place of those that draw, so
// that nothing but the samplers differs. The weather's normals are drawn again
// on gonum in place of the shared ones.
func onGonum(p *program) {
	m := p.model
	binomial := func(b *block, i int, n int64, prob float64) int64 {
		if n == 0 || prob <= 0 {
			return 0
		}
		if prob >= 1 {
			return n
		}
		return int64(distuv.Binomial{N: float64(n), P: prob, Src: &b.demography[i]}.Rand())
	}
	poisson := func(b *block, i int, mean float64) int64 {
		if mean <= 0 {
			return 0
		}
		return int64(distuv.Poisson{Lambda: mean, Src: &b.demography[i]}.Rand())
	}
	if p.flow != nil {
		f := p.flow
		for k := range p.passes {
			if k == len(p.passes)-1 {
				if f.eventsBelow > 0 {
					p.passes[k] = func(b *block, y int) {
						for i := 0; i < b.lanes; i++ {
							gonumEvents(f, b, i)
						}
					}
				} else {
					p.passes[k] = func(b *block, y int) {
						for i := 0; i < b.lanes; i++ {
							for s := 0; s < f.substeps; s++ {
								gonumJump(f, b, i, 1/float64(f.substeps))
							}
						}
					}
				}
			}
		}
		if len(p.passes) > 1 && p.model.Birth.Sigma != 0 {
			p.passes = append([]pass{gonumNormals}, p.passes...)
		}
		return
	}
	crowded := m.BirthCrowding.Form != rates.None
	var passes []pass
	passes = append(passes, gonumNormals)
	passes = append(passes, weatherPasses(m)...)
	passes = append(passes, func(b *block, _ int) {
		for i := 0; i < b.lanes; i++ {
			if rand.New(&b.catGonum()[i]).Float64() < m.Case.Catastrophe[0].Prob() {
				b.birth[i] *= m.Case.Catastrophe[0].BirthsTimes
				b.n[i] = binomial(b, i, b.n[i], 1-m.Kills[0].Mean)
			}
		}
	}, func(b *block, _ int) {
		for i := 0; i < b.lanes; i++ {
			b.n[i] = binomial(b, i, b.n[i], b.survival[i])
		}
	}, func(b *block, _ int) {
		for i := 0; i < b.lanes; i++ {
			f := b.birth[i]
			if crowded {
				f = m.BirthAt(f, float64(b.n[i]))
			}
			b.n[i] += poisson(b, i, f*float64(b.n[i]))
		}
	}, checkOutgrown, harvest(m, 0), checkOutgrown)
	p.passes = passes
}

func (b *block) catGonum() *[lanesMax]rng.Stream { return &b.taking }

// gonumNormals replaces the year's shared normals by gonum's.
func gonumNormals(b *block, _ int) {
	for i := 0; i < b.lanes; i++ {
		n := distuv.Normal{Mu: 0, Sigma: 1, Src: &b.start[i]}
		b.shared.u1[i], b.shared.u2[i] = n.Rand(), n.Rand()
	}
}

func gonumJump(f *flow, b *block, i int, tau float64) {
	n := b.n[i]
	if n == 0 {
		return
	}
	at := float64(n)
	growth := f.m.BirthAt(b.birth[i], at) - f.m.DeathAt(b.death[i], at)
	at *= 1 + growth*tau/2
	birth, death := f.m.BirthAt(b.birth[i], at), f.m.DeathAt(b.death[i], at)
	x := (birth - death) * tau
	g := tau
	if math.Abs(x) > 1e-8 {
		g = tau * math.Expm1(x) / x
	}
	bg := birth * g
	s := int64(distuv.Binomial{N: float64(n), P: 1 - death*g/(1+bg), Src: &b.demography[i]}.Rand())
	b.n[i] = s
	if bg > 0 && s > 0 {
		// A negative binomial as a Poisson of a gamma.
		mean := distuv.Gamma{Alpha: float64(s), Beta: 1 / bg, Src: &b.demography[i]}.Rand()
		b.n[i] += int64(distuv.Poisson{Lambda: mean, Src: &b.demography[i]}.Rand())
	}
}

// gonumEvents is events on gonum's exponential and uniform.
func gonumEvents(f *flow, b *block, i int) {
	e := distuv.Exponential{Rate: 1, Src: &b.demography[i]}
	uniform := distuv.Uniform{Min: 0, Max: 1, Src: &b.demography[i]}
	n := b.n[i]
	for t := 0.0; ; {
		birth, death := f.total(b, i, n)
		if birth+death <= 0 {
			break
		}
		if t += e.Rand() / (birth + death); t >= 1 {
			break
		}
		if uniform.Rand()*(birth+death) < birth {
			n++
		} else {
			n--
		}
	}
	b.n[i] = n
}

// BenchmarkWorkers is a whole run with one worker and with two.
func BenchmarkWorkers(b *testing.B) {
	m := workload(b, "pulse-large.toml")
	for _, workers := range []int{1, 2} {
		b.Run(map[int]string{1: "one", 2: "two"}[workers], func(b *testing.B) {
			for i := 0; i < b.N; i++ {
				e, err := New(1, m)
				if err != nil {
					b.Fatal(err)
				}
				if _, err := ensemble.Run(b.Context(), e, ensemble.Plan{Replicates: 4096, Workers: workers}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
