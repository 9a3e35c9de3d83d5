package sweep

import (
	"math/bits"

	"ebbline/pva/ensemble"
)

// recorder takes the censuses of one worker's blocks into the tallies of a
// unit. Its variants are those of the group's engine: the case, then the
// baselines, then the cells. One goroutine calls it, so that it has no locks.
type recorder struct {
	horizons []int
	baseline []int // of each variant: which variant is its baseline; -1 if none
	tallies  []Tally
	fallen   []uint64 // at the end of the block, by variant
}

func newRecorder(horizons, baseline []int) *recorder {
	return &recorder{horizons: horizons, baseline: baseline, tallies: make([]Tally, len(horizons)), fallen: make([]uint64, len(horizons))}
}

// Census adds one row.
func (r *recorder) Census(variant, year int, row *ensemble.Row, _, _ uint64) {
	t, horizon := &r.tallies[variant], r.horizons[variant]
	for k := range t.Fallen {
		if checkpoint(k, horizon) == year {
			t.Fallen[k] += int64(bits.OnesCount64(row.Fallen))
		}
	}
	out := row.Outgrown
	t.KeptYears += int64(row.Lanes - bits.OnesCount64(out))
	if row.Takes {
		t.Closed += int64(bits.OnesCount64(row.Closed &^ out))
		var take, short, extra int64
		for i := 0; i < row.Lanes; i++ {
			kept := int64(out>>uint(i)&1) - 1 // all ones unless outgrown
			take += row.Take[i] & kept
			short += row.Shortfall[i] & kept
			extra += row.Extra[i] & kept
		}
		t.Take.Add(take)
		t.Shortfall.Add(short)
		t.Extra.Add(extra)
	}
	if year < horizon {
		return
	}
	t.Outgrown += int64(bits.OnesCount64(out))
	var last int64
	for i := 0; i < row.Lanes; i++ {
		if out>>uint(i)&1 == 0 {
			last += row.N[i]
			if row.N[i] == 0 {
				t.Extinct++
			}
		}
	}
	t.Last.Add(last)
}

// Finish adds the end of a block. Variants finish in their order, so that the
// case and the baselines are known before the cells.
func (r *recorder) Finish(variant int, end *ensemble.End) {
	t := &r.tallies[variant]
	t.Replicates += int64(end.Lanes)
	for i := 0; i < end.Lanes; i++ {
		if s := end.Smallest[i]; s >= 0 {
			t.Smallest.Add(s)
			t.SmallestOf++
		}
	}
	r.fallen[variant] = end.Fallen
	t.OnlyThis += int64(bits.OnesCount64(end.Fallen &^ r.fallen[0]))
	t.OnlyCase += int64(bits.OnesCount64(r.fallen[0] &^ end.Fallen))
	if b := r.baseline[variant]; b >= 0 {
		t.OnlyThisNotBase += int64(bits.OnesCount64(end.Fallen &^ r.fallen[b]))
		t.OnlyBase += int64(bits.OnesCount64(r.fallen[b] &^ end.Fallen))
	}
}
