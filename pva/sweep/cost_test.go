package sweep

import (
	"context"
	"testing"

	"ebbline/pva"
	"ebbline/pva/assess"
)

// sixty is a grid of 60 takes over 50 years.
func sixty(t testing.TB, baseline bool, replicates int) *pva.Case {
	return marsh(t, "question.horizon", 50, "start.abundance", 180, "births.crowding.capacity", 420, "run.replicates", replicates, "run.baseline", baseline,
		"sweep.1.key", "harvest.control.take", "sweep.1.from", 0, "sweep.1.to", 14.75, "sweep.1.step", .25)
}

// BenchmarkSixtyTakes holds a sweep of 60 takes against 60 assessments of the
// same cases, both without exact answers: ns/op of the one over the other.
func BenchmarkSixtyTakes(b *testing.B) {
	for _, baseline := range []bool{false, true} {
		name := map[bool]string{false: "without a baseline", true: "with baselines"}[baseline]
		c := sixty(b, baseline, 1000)
		s := grid(b, c)
		b.Run("sweep "+name, func(b *testing.B) {
			for b.Loop() {
				run(b, s, Options{Workers: 1})
			}
		})
		b.Run("assessments "+name, func(b *testing.B) {
			for b.Loop() {
				for i := range s.Cells() {
					cell, faults := c.With(s.Settings(i))
					if len(faults) > 0 {
						b.Fatal(faults)
					}
					if _, err := assess.Run(context.Background(), cell, assess.Options{Workers: 1, Exact: assess.ExactNever}); err != nil {
						b.Fatal(err)
					}
				}
			}
		})
	}
}
