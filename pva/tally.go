package pva

// Tally is what many replicates of one case add up to: whole numbers only, so
// that any order of adding gives the same tally. Everything that is reported is
// derived from it in package estimate. Index y-1 of Years is model year y.
type Tally struct {
	Replicates int64
	Years      []YearTally
	Smallest   Histogram // smallest census of years 1 to the horizon (until outgrown)
	// LogGrowth sums ln N(last) - ln N(first) over each replicate's run of
	// censuses before it fell or outgrew, in steps of 2^-32; LogPairs counts
	// the pairs of consecutive censuses in those runs.
	LogGrowth Sum
	LogPairs  int64
	// Capped counts lane-years in which at-most-one offspring had a mean above
	// one and was capped.
	Capped int64
	// Batch holds replicates and those fallen by the horizon, by replicate
	// number modulo Batches, to show convergence.
	Batch [Batches]struct{ Replicates, Fallen int64 }
}

// Batches is the number of interleaved batches in a tally.
const Batches = 10

// YearTally is one year of a tally.
type YearTally struct {
	Fallen    int64 // replicates fallen by this year
	Extinct   int64 // replicates with N = 0 at this census
	Outgrown  int64 // replicates outgrown by this year
	Sum       Sum   // N over replicates not outgrown
	Abundance Histogram
	Take      Histogram // animals' units taken in the year, replicates not outgrown
	TakeSum   Sum
	Shortfall Sum   // intended but not there to take
	ExtraSum  Sum   // extra deaths
	Stocked   Sum   // added
	Closed    int64 // replicates in which a scheduled take was closed
	// OnlyThis and OnlyCase count the discordant replicates against the case
	// itself: fallen by this year here and not there, and the other way round.
	OnlyThis, OnlyCase int64
	// OnlyThisNotSecond and OnlySecond are the same against the second variant
	// of the run, which is the baseline where there is one.
	OnlyThisNotSecond, OnlySecond int64
}

// NewTally makes an empty tally for a horizon in years.
func NewTally(horizon int) *Tally { return &Tally{Years: make([]YearTally, horizon)} }

// Merge adds another tally of the same horizon.
func (t *Tally) Merge(o *Tally) {
	t.Replicates += o.Replicates
	t.Smallest.Merge(&o.Smallest)
	t.LogGrowth.Merge(o.LogGrowth)
	t.LogPairs += o.LogPairs
	t.Capped += o.Capped
	for i := range t.Batch {
		t.Batch[i].Replicates += o.Batch[i].Replicates
		t.Batch[i].Fallen += o.Batch[i].Fallen
	}
	for i := range t.Years {
		y, z := &t.Years[i], &o.Years[i]
		y.Fallen += z.Fallen
		y.Extinct += z.Extinct
		y.Outgrown += z.Outgrown
		y.Sum.Merge(z.Sum)
		y.Abundance.Merge(&z.Abundance)
		y.Take.Merge(&z.Take)
		y.TakeSum.Merge(z.TakeSum)
		y.Shortfall.Merge(z.Shortfall)
		y.ExtraSum.Merge(z.ExtraSum)
		y.Stocked.Merge(z.Stocked)
		y.Closed += z.Closed
		y.OnlyThis += z.OnlyThis
		y.OnlyCase += z.OnlyCase
		y.OnlyThisNotSecond += z.OnlyThisNotSecond
		y.OnlySecond += z.OnlySecond
	}
}
