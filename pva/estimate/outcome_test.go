package estimate

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"ebbline/pva"
)

// replicate is one replicate as a test makes it up: its census, take and so on,
// year by year until it outgrew, and the year it fell, 0 if it did not.
type replicate struct {
	census, take, short, extra, stock []int64
	closed                            []bool
	fallen                            int
}

const testHorizon = 7

// madeUp draws replicates of an invented population that now and then jumps.
func madeUp(n int, threshold int64, seed uint64) []replicate {
	r := rand.New(rand.NewPCG(seed, 1))
	all := make([]replicate, n)
	for i := range all {
		p := &all[i]
		now := int64(40)
		for y := 1; y <= testHorizon; y++ {
			now = int64(float64(now) * math.Exp(0.8*r.NormFloat64()-0.1))
			if now > 400 {
				break
			}
			p.census = append(p.census, now)
			p.take = append(p.take, r.Int64N(6))
			p.short = append(p.short, r.Int64N(3))
			p.extra = append(p.extra, r.Int64N(2))
			p.stock = append(p.stock, r.Int64N(9))
			p.closed = append(p.closed, r.IntN(4) == 0)
			if p.fallen == 0 && now <= threshold {
				p.fallen = y
			}
		}
	}
	return all
}

// tallied adds replicates up as the tally's fields say.
func tallied(all []replicate) *pva.Tally {
	t := pva.NewTally(testHorizon)
	t.Replicates = int64(len(all))
	for i, p := range all {
		if len(p.census) > 0 {
			t.Smallest.Add(slices.Min(p.census))
		}
		b := &t.Batch[i%pva.Batches]
		b.Replicates++
		if p.fallen > 0 {
			b.Fallen++
		}
		for y := range t.Years {
			s := &t.Years[y]
			if p.fallen > 0 && p.fallen <= y+1 {
				s.Fallen++
			}
			if y >= len(p.census) {
				s.Outgrown++
				continue
			}
			if p.census[y] == 0 {
				s.Extinct++
			}
			if p.closed[y] {
				s.Closed++
			}
			s.Sum.Add(p.census[y])
			s.Abundance.Add(p.census[y])
			s.Take.Add(p.take[y])
			s.TakeSum.Add(p.take[y])
			s.Shortfall.Add(p.short[y])
			s.ExtraSum.Add(p.extra[y])
			s.Stocked.Add(p.stock[y])
		}
	}
	return t
}

func testCase(threshold float64) *pva.Case {
	c := &pva.Case{Question: pva.Question{Threshold: threshold, Horizon: testHorizon, Confidence: 0.9}}
	c.Start = pva.Start{Abundance: 40.5, Year: pva.Optional{Value: 2031, Set: true}}
	return c
}

// point is the smallest value with at least the share of all at or below it,
// straight from the sorted values; absent ones are above all.
func point(values []int64, all int, share float64) float64 {
	sorted := slices.Sorted(slices.Values(values))
	for i, v := range sorted {
		if float64(i+1) >= share*float64(all)-1e-9 {
			return float64(v)
		}
	}
	return math.Inf(1)
}

func meanOf(values []int64) float64 {
	sum := 0.0
	for _, v := range values {
		sum += float64(v)
	}
	return sum / float64(len(values))
}

// The outcome is compared with figures taken straight from the replicates.
func TestOutcomeAgainstTheReplicates(t *testing.T) {
	for _, size := range []int{1, 2, 20, 100, 1037} {
		all := madeUp(size, 12, uint64(size))
		tally := tallied(all)
		o := Outcome(testCase(12.7), tally)
		take, short, closedYears := 0.0, 0.0, 0.0
		for y := range testHorizon {
			var census, takes, shorts, extras, stocks []int64
			fallen, extinct, closed := int64(0), int64(0), int64(0)
			for _, p := range all {
				if p.fallen > 0 && p.fallen <= y+1 {
					fallen++
				}
				if y < len(p.census) {
					census, takes = append(census, p.census[y]), append(takes, p.take[y])
					shorts, extras = append(shorts, p.short[y]), append(extras, p.extra[y])
					stocks = append(stocks, p.stock[y])
					extinct += int64(toFloat(p.census[y] == 0))
					closed += int64(toFloat(p.closed[y]))
				}
			}
			got, n := o.Years[y], int64(size)
			want := pva.YearResult{
				Year: y + 1, Label: 2031 + y,
				Fallen: Proportion(fallen, n, 0.9), Extinct: Proportion(extinct, n, 0.9),
				Outgrown: n - int64(len(census)),
				Mean:     meanOf(census), TakeMean: meanOf(takes), ShortfallMean: meanOf(shorts),
				ExtraMean: meanOf(extras), StockedMean: meanOf(stocks),
				Abundance: pva.Percentiles{P05: point(census, size, 0.05), P25: point(census, size, 0.25), P50: point(census, size, 0.5), P75: point(census, size, 0.75), P95: point(census, size, 0.95)},
				Take:      pva.Percentiles{P05: point(takes, len(takes), 0.05), P25: point(takes, len(takes), 0.25), P50: point(takes, len(takes), 0.5), P75: point(takes, len(takes), 0.75), P95: point(takes, len(takes), 0.95)},
				Closed:    Proportion(closed, int64(len(census)), 0.9),
			}
			if len(census) > 0 && got != want {
				t.Errorf("%d replicates, year %d:\n%+v, want\n%+v", size, y+1, got, want)
			}
			take, short, closedYears = take+want.TakeMean, short+want.ShortfallMean, closedYears+want.Closed.Estimate
		}
		last := o.Years[testHorizon-1]
		if o.Risk != last.Fallen || o.Extinction != last.Extinct || o.Outgrown != last.Outgrown || o.Replicates != int64(size) {
			t.Errorf("%d replicates: the whole does not agree with the last year: %+v", size, o)
		}
		if size >= 20 {
			near(t, "the take over the horizon", o.TakeTotalMean, take, 1e-12)
			near(t, "the take a year", o.TakeMean, take/testHorizon, 1e-12)
			near(t, "the shortfall a year", o.ShortfallMean, short/testHorizon, 1e-12)
			near(t, "the closed years", o.ClosedYears, closedYears, 1e-12)
		}
		for share, got := range map[float64]int{0.25: o.FallP25, 0.5: o.FallP50, 0.75: o.FallP75} {
			want := 0
			for y := testHorizon - 1; y >= 0; y-- {
				if o.Years[y].Fallen.Estimate >= share {
					want = y + 1
				}
			}
			if got != want {
				t.Errorf("%d replicates: a share of %v has fallen by year %d, want %d", size, share, got, want)
			}
		}
		if want := min(size, pva.Batches); len(o.Batches) != want {
			t.Errorf("%d replicates: %d batches, want %d", size, len(o.Batches), want)
		}
		var smallest []int64
		for _, p := range all {
			if len(p.census) > 0 {
				smallest = append(smallest, slices.Min(p.census))
			}
		}
		if len(smallest) > 0 {
			near(t, "the expected minimum", o.SmallestMean, meanOf(smallest), 1e-11)
		}
		checkLevels(t, o, smallest, 12)
	}
}

// checkLevels holds the levels against the smallest censuses themselves.
func checkLevels(t *testing.T, o *pva.Outcome, smallest []int64, threshold int64) {
	t.Helper()
	if len(o.Smallest) > 110 {
		t.Errorf("%d levels are no readable ladder", len(o.Smallest))
	}
	found := map[int64]bool{}
	for i, l := range o.Smallest {
		found[l.Level] = true
		count := int64(0)
		for _, v := range smallest {
			count += int64(toFloat(v <= l.Level))
		}
		if l.Risk != Proportion(count, o.Replicates, 0.9) {
			t.Errorf("level %d has %d of %d, want %d of %d", l.Level, l.Risk.Count, l.Risk.Of, count, o.Replicates)
		}
		if i > 0 && !(o.Smallest[i-1].Level < l.Level && o.Smallest[i-1].Risk.Count <= l.Risk.Count) {
			t.Errorf("levels %v and %v are out of order", o.Smallest[i-1], l)
		}
		if l.Level == threshold && l.Risk != o.Risk {
			t.Errorf("the chance at the threshold is %v, the risk %v", l.Risk, o.Risk)
		}
	}
	for _, v := range []int64{0, threshold, 40} {
		if !found[v] {
			t.Errorf("level %d is missing", v)
		}
	}
	if len(smallest) > 0 && !found[slices.Max(smallest)] {
		t.Errorf("the largest, %d, is missing", slices.Max(smallest))
	}
}

// Growth is the mean of ln N(last) - ln N(first) a pair, in steps of 2^-32.
func TestMeanLogGrowth(t *testing.T) {
	tally := pva.NewTally(testHorizon)
	tally.Replicates = 2
	if got := Outcome(testCase(5), tally).MeanLogGrowth; !math.IsNaN(got) {
		t.Errorf("without pairs growth is %v", got)
	}
	tally.LogGrowth.Add(int64(math.Round(math.Log(80.0/40) * pva.FixedPoint)))
	tally.LogGrowth.Add(int64(math.Round(math.Log(10.0/40) * pva.FixedPoint)))
	tally.LogPairs = 5
	// Two roundings of half a step of 2^-32, over five pairs.
	near(t, "growth", Outcome(testCase(5), tally).MeanLogGrowth, -math.Ln2/5, 0x1p-32/5)
}

// All outgrown, or nothing simulated yet: no numbers, and no crash.
func TestOutcomeOfNothing(t *testing.T) {
	tally := pva.NewTally(testHorizon)
	o := Outcome(testCase(5), tally)
	if !math.IsNaN(o.Risk.Estimate) || o.Risk.Low != 0 || o.Risk.High != 1 || o.FallP25 != 0 || len(o.Batches) != 0 {
		t.Errorf("of no replicates: %+v", o)
	}
	tally.Replicates = 10
	for y := range tally.Years {
		tally.Years[y].Outgrown = 10
	}
	o = Outcome(testCase(5), tally)
	y := o.Years[0]
	if !math.IsInf(y.Abundance.P05, 1) || !math.IsNaN(y.Mean) || !math.IsNaN(y.Take.P50) || !math.IsNaN(o.TakeMean) || o.Risk.Estimate != 0 || o.Outgrown != 10 {
		t.Errorf("all outgrown: %+v", o)
	}
}

// Quarters are reached at exactly a quarter, and not one replicate before.
func TestYearOfFall(t *testing.T) {
	tally := pva.NewTally(testHorizon)
	tally.Replicates = 8
	for y, fallen := range []int64{0, 1, 2, 3, 4, 5, 5} {
		tally.Years[y].Fallen = fallen
	}
	o := Outcome(testCase(5), tally)
	if o.FallP25 != 3 || o.FallP50 != 5 || o.FallP75 != 0 {
		t.Errorf("quartiles are years %d, %d, %d, want 3, 5 and none", o.FallP25, o.FallP50, o.FallP75)
	}
}
