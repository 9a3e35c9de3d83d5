package ensemble

import (
	"math/bits"
	"sync"

	"ebbline/pva"
)

// accumulator adds rows into shared tallies, with a lock for each variant and
// year: two workers meet in the same year of the same variant rarely, and a row
// is added in a few hundred nanoseconds.
type accumulator struct {
	tallies []*pva.Tally
	years   [][]sync.Mutex
	ends    []sync.Mutex
}

func newAccumulator(horizons []int) *accumulator {
	a := &accumulator{ends: make([]sync.Mutex, len(horizons))}
	for _, h := range horizons {
		a.tallies = append(a.tallies, pva.NewTally(h))
		a.years = append(a.years, make([]sync.Mutex, h))
	}
	return a
}

// Census adds one row.
func (a *accumulator) Census(variant, year int, row *Row, caseFallen, otherFallen uint64) {
	mu := &a.years[variant][year-1]
	mu.Lock()
	defer mu.Unlock()
	t := &a.tallies[variant].Years[year-1]
	t.Fallen += int64(bits.OnesCount64(row.Fallen))
	t.Outgrown += int64(bits.OnesCount64(row.Outgrown))
	t.Closed += int64(bits.OnesCount64(row.Closed &^ row.Outgrown))
	t.OnlyThis += int64(bits.OnesCount64(row.Fallen &^ caseFallen))
	t.OnlyCase += int64(bits.OnesCount64(caseFallen &^ row.Fallen))
	t.OnlyThisNotSecond += int64(bits.OnesCount64(row.Fallen &^ otherFallen))
	t.OnlySecond += int64(bits.OnesCount64(otherFallen &^ row.Fallen))
	var n, take, short, extra, stocked int64
	for i := 0; i < row.Lanes; i++ {
		if row.Outgrown>>uint(i)&1 != 0 {
			continue
		}
		v := row.N[i]
		n += v
		if v == 0 {
			t.Extinct++
		}
		t.Abundance.Add(v)
	}
	t.Sum.Add(n)
	if row.Takes {
		for i := 0; i < row.Lanes; i++ {
			if row.Outgrown>>uint(i)&1 != 0 {
				continue
			}
			take += row.Take[i]
			short += row.Shortfall[i]
			extra += row.Extra[i]
			t.Take.Add(row.Take[i])
		}
		t.TakeSum.Add(take)
		t.Shortfall.Add(short)
		t.ExtraSum.Add(extra)
	}
	if row.Stocks {
		for i := 0; i < row.Lanes; i++ {
			if row.Outgrown>>uint(i)&1 == 0 {
				stocked += row.Stocked[i]
			}
		}
		t.Stocked.Add(stocked)
	}
}

// Finish adds the end of a block.
func (a *accumulator) Finish(variant int, end *End) {
	a.ends[variant].Lock()
	defer a.ends[variant].Unlock()
	t := a.tallies[variant]
	t.LogGrowth.Add(end.LogGrowth)
	t.LogPairs += end.LogPairs
	t.Capped += end.Capped
	for i := 0; i < end.Lanes; i++ {
		if end.Smallest[i] >= 0 {
			t.Smallest.Add(end.Smallest[i])
		}
		b := &t.Batch[(end.First+int64(i))%pva.Batches]
		b.Replicates++
		b.Fallen += int64(end.Fallen >> uint(i) & 1)
	}
}
