package year

import (
	"fmt"

	"ebbline/pva/ensemble"
	"ebbline/rng"
	"ebbline/rng/portable"
)

// block is the state of up to 64 replicates of one variant. Arrays and the
// bits of masks are indexed by lane.
type block struct {
	program *program
	shared  *shared
	first   int64 // number of the replicate in lane 0
	step    int64 // from one lane's number to the next's
	lanes   int
	all     uint64 // mask of the lanes in use
	seed    uint64
	err     error

	n        [lanesMax]int64
	birth    [lanesMax]float64 // this year's births per head, before crowding
	death    [lanesMax]float64 // this year's deaths per head, before crowding
	survival [lanesMax]float64 // pulse: this year's chance of survival, where it is drawn as such
	eBirth   [lanesMax]float64 // the weather's normal series
	eDeath   [lanesMax]float64
	seen     [][lanesMax]float64 // last survey, one a harvest rule
	breeders [lanesMax]int64     // pulse: those whose young are born this year
	most     int64               // flow: the largest N of the lane in work this year

	outgrown uint64
	watched  uint64 // watch = always: at or below the threshold at some time
	row      ensemble.Row
	smallest [lanesMax]int64
	firstN   [lanesMax]int64 // first and last census before falling, 0 if none
	lastN    [lanesMax]int64
	pairs    int64
	capped   int64

	start, demography, taking, stocking [lanesMax]rng.Stream
}

func newBlock(p *program) *block {
	return &block{program: p, seen: make([][lanesMax]float64, len(p.model.Takes))}
}

// begin sets the lanes to their start: model section 7.
func (b *block) begin(seed uint64, first, step int64, lanes int) {
	b.seed, b.first, b.step, b.lanes = seed, first, step, lanes
	b.all = ^uint64(0) >> uint(lanesMax-lanes)
	b.outgrown, b.watched, b.err = 0, 0, nil
	b.row = ensemble.Row{Lanes: lanes, Takes: b.program.takes, Stocks: b.program.stocks}
	b.pairs, b.capped = 0, 0
	c := b.program.model.Case
	for i := 0; i < lanes; i++ {
		r := uint64(first + int64(i)*step)
		b.start[i].Seed(seed, r, rng.Start)
		b.demography[i].Seed(seed, r, rng.Demography)
		b.taking[i].Seed(seed, r, rng.Taking)
		b.stocking[i].Seed(seed, r, rng.Stocking)
		n0 := c.Start.Abundance
		if c.Start.CV > 0 {
			n0 *= b.program.startLaw.Factor(rng.Normal(&b.start[i]))
		}
		b.smallest[i], b.firstN[i], b.lastN[i] = -1, 0, 0
		if n0 > c.Run.StopAbove {
			b.outgrow(i)
			continue
		}
		b.n[i] = rng.Round(&b.start[i], n0)
	}
	if b.program.always {
		watch(b, 0)
	}
}

func (b *block) beginYear(s *shared) {
	b.shared = s
	b.row.Closed = 0
	if b.program.takes {
		b.row.Take, b.row.Shortfall, b.row.Extra = [lanesMax]int64{}, [lanesMax]int64{}, [lanesMax]int64{}
	}
	if b.program.stocks {
		b.row.Stocked = [lanesMax]int64{}
	}
}

// outgrow stops a lane for good: it holds no animals any more and is left out
// of every row from now on.
func (b *block) outgrow(i int) {
	b.outgrown |= 1 << uint(i)
	b.n[i] = 0
}

func (b *block) isOutgrown(i int) bool { return b.outgrown>>uint(i)&1 != 0 }

// checkOutgrown stops the lanes that have passed stop_above.
func checkOutgrown(b *block, _ int) {
	limit := b.program.stopAbove
	for i := 0; i < b.lanes; i++ {
		if b.n[i] > limit {
			b.outgrow(i)
		}
	}
}

// ceiling cuts the lanes to the ceiling.
func ceiling(b *block, _ int) {
	most := b.program.ceiling
	for i := 0; i < b.lanes; i++ {
		b.n[i] = min(b.n[i], most)
	}
}

// watch marks the lanes at or below the threshold now.
func watch(b *block, _ int) {
	for i := 0; i < b.lanes; i++ {
		if b.n[i] <= b.program.threshold && !b.isOutgrown(i) {
			b.watched |= 1 << uint(i)
		}
	}
}

// census records the year and marks who has fallen: model section 2, step 6.
func (b *block) census(int) {
	fallen := b.row.Fallen | b.watched
	threshold := b.program.threshold
	for i := 0; i < b.lanes; i++ {
		if b.isOutgrown(i) {
			continue
		}
		n := b.n[i]
		if n <= threshold {
			fallen |= 1 << uint(i)
		}
		if b.smallest[i] < 0 || n < b.smallest[i] {
			b.smallest[i] = n
		}
		if fallen>>uint(i)&1 == 0 {
			if b.firstN[i] == 0 {
				b.firstN[i] = n
			} else {
				b.pairs++
			}
			b.lastN[i] = n
		}
	}
	b.row.N = b.n
	b.row.Fallen = fallen
	b.row.Outgrown = b.outgrown
}

// finish sums up the lanes at the end of a block. The sum of log growth over a
// run of censuses telescopes to the logarithm of its last over its first.
func (b *block) finish(end *ensemble.End) {
	*end = ensemble.End{Lanes: b.lanes, Smallest: b.smallest, Fallen: b.row.Fallen, LogPairs: b.pairs, Capped: b.capped}
	for i := 0; i < b.lanes; i++ {
		if b.firstN[i] > 0 {
			growth := portable.Log(float64(b.lastN[i])) - portable.Log(float64(b.firstN[i]))
			end.LogGrowth += int64(growth * (1 << 32))
		}
	}
}

// fail keeps the first error of a block; it names the replicate so that it can
// be run again alone.
func (b *block) fail(lane, y int, what string) {
	if b.err == nil {
		b.err = fmt.Errorf("%s in replicate %d, year %d (seed %d)", what, b.first+int64(lane)*b.step, b.program.model.Case.Label(y), b.seed)
	}
}
