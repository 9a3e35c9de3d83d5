package estimate

import (
	"math/rand/v2"
	"testing"

	"ebbline/pva"
)

// A spread over many values is shown by round levels and shares.
func TestLadderOfAWideSpread(t *testing.T) {
	for _, most := range []int64{300, 4000, 3e6, 2e9} {
		r := rand.New(rand.NewPCG(5, uint64(most)))
		tally := pva.NewTally(testHorizon)
		tally.Replicates = 5000
		threshold, fallen := most/10, int64(0)
		for range tally.Replicates {
			v := r.Int64N(most)
			tally.Smallest.Add(v)
			if v <= threshold {
				fallen++
			}
		}
		tally.Years[testHorizon-1].Fallen = fallen
		o := Outcome(testCase(float64(threshold)), tally)
		if len(o.Smallest) < 30 || len(o.Smallest) > 70 {
			t.Errorf("to %d: %d levels", most, len(o.Smallest))
		}
		previous := pva.Level{Level: -1}
		for _, l := range o.Smallest {
			if l.Level <= previous.Level || l.Risk.Count < previous.Risk.Count {
				t.Errorf("to %d: %v after %v", most, l, previous)
			}
			// No step holds more than a few of the 32 shares: the ladder is
			// spread by chance, not by size.
			if step := l.Risk.Count - previous.Risk.Count; step > tally.Replicates/10 {
				t.Errorf("to %d: %d replicates between %d and %d", most, step, previous.Level, l.Level)
			}
			if l.Level == threshold && l.Risk != o.Risk {
				t.Errorf("to %d: %v at the threshold, risk %v", most, l.Risk, o.Risk)
			}
			previous = l
		}
		if previous.Risk.Count != tally.Replicates {
			t.Errorf("to %d: the last level holds %d", most, previous.Risk.Count)
		}
	}
}

// In a bin wider than one value the tally cannot tell which are at or below the
// threshold; the risk can, and the levels around it keep their order. So they do
// where more have fallen, between censuses, than any census shows.
func TestThresholdInsideABin(t *testing.T) {
	const threshold = 1<<20 + 100 // the bin is 512 wide and starts at 1<<20
	tally := pva.NewTally(testHorizon)
	tally.Replicates = 400
	for i := range int64(400) {
		tally.Smallest.Add(threshold + 8*(i-199)) // 200 at or below
	}
	c := testCase(threshold + 0.5)
	c.Start.Abundance = threshold - 20 // a level in the threshold's bin
	for _, fallen := range []int64{200, 399} {
		tally.Years[testHorizon-1].Fallen = fallen
		o := Outcome(c, tally)
		for i, l := range o.Smallest {
			if l.Level == threshold && l.Risk != o.Risk {
				t.Errorf("the chance at the threshold is %v, the risk %v", l.Risk, o.Risk)
			}
			if i > 0 && l.Risk.Count < o.Smallest[i-1].Risk.Count {
				t.Errorf("%v after %v", l, o.Smallest[i-1])
			}
		}
	}
}

func TestThreeFigures(t *testing.T) {
	for v, want := range map[int64]int64{0: 0, 7: 7, 999: 999, 1000: 1000, 1001: 1010, 9991: 10000, 123456: 124000, 4e18: 4e18} {
		if got := threeFigures(v); got != want {
			t.Errorf("%d rounds up to %d, want %d", v, got, want)
		}
	}
}
