package year

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// TestOutgrownForGood: a replicate that passes stop_above is stopped at that very
// event, however it came there. Births and deaths of 1 a head from 5, stopped
// above 10: the chance of having passed by a year is that of the chain whose
// states above 10 are one that is never left, from its generator by the matrix
// exponential (gonum). At 400,000 replicates a chance off by a fiftieth is caught
// (z = 5.73, false alarm 1e-8).
func TestOutgrownForGood(t *testing.T) {
	const n, top, years = 400000, 10, 3
	q := mat.NewDense(top+2, top+2, nil)
	for k := 1; k <= top; k++ {
		q.Set(k, k+1, float64(k))
		q.Set(k, k-1, float64(k))
		q.Set(k, k, -2*float64(k))
	}
	for name, more := range map[string][]any{
		"all lanes together": nil,
		"every event":        {"question.watch", "always"},
		"with a take":        {"harvest.1.rule", "constant", "harvest.1.take", 0, "harvest.1.when", "through"},
	} {
		c := caseOf(t, append([]any{"question.threshold", 0, "question.horizon", years, "start.abundance", 5, "births.breeding", "flow", "births.rate", 1, "deaths.rate", 1,
			"run.substeps", "events", "run.stop_above", top, "run.seed", 3}, more...)...)
		out := run(t, c, n, 2)
		for y := 1; y <= years; y++ {
			var at, p mat.Dense
			at.Scale(float64(y), q)
			p.Exp(&at)
			want := p.At(5, top+1)
			got := float64(out.Years[y-1].Outgrown) / n
			if sd := math.Sqrt(want * (1 - want) / n); math.Abs(got-want) > 5.73*sd {
				t.Errorf("%s: outgrown by year %d %.5f, want %.5f", name, y, got, want)
			}
		}
	}
}
