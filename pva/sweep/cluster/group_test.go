package cluster

import (
	"fmt"
	"math/rand/v2"
	"strconv"
	"strings"
	"testing"

	"ebbline/pva/sweep"
)

// TestShards: never more tasks than the cluster takes, never a shard without a
// unit for each of its cores, and about ten minutes each where neither binds.
func TestShards(t *testing.T) {
	for _, c := range []struct {
		units       int
		seconds     float64
		cores, most int
		want        int
	}{
		{32, 5, 1, 1001, 1},                // seconds of work: one task
		{200, 6000, 1, 1001, 10},           // ten times ten minutes
		{200, 6001, 1, 1001, 11},           // never longer than meant
		{200, 6000, 4, 1001, 3},            // with four cores
		{1_000_000, 3e7, 1, 1001, 1000},    // 50,000 wanted; the highest index is 1000
		{1_000_000, 3e7, 1, 100_001, 50e3}, // a cluster that takes more
		{6, 1e9, 4, 1001, 1},               // a unit for each core
		{1, 1e9, 1, 1001, 1},
		{10, 1e9, 1, 2, 1}, // the smallest MaxArraySize that takes an array
		{10, 1e9, 0, 1001, 10},
	} {
		if got := Shards(c.units, c.seconds, c.cores, c.most); got != c.want {
			t.Errorf("%+v: %d shards", c, got)
		}
	}
	r := rand.New(rand.NewPCG(5, 7))
	for range 20_000 {
		units, cores, most := 1+r.IntN(1<<r.IntN(20)), 1+r.IntN(64), 2+r.IntN(5000)
		n := Shards(units, float64(units)*40*r.Float64(), cores, most)
		if n < 1 || n >= most || n > units {
			t.Fatalf("%d units on %d cores, MaxArraySize %d: %d shards", units, cores, most, n)
		}
	}
}

// TestEveryUnitOnce: the sizes of the shards add up to the units, whatever their
// number, and are those of "every so many-th unit".
func TestEveryUnitOnce(t *testing.T) {
	for units := 1; units < 60; units++ {
		for shards := 1; shards <= units; shards++ {
			sum := 0
			for s := 1; s <= shards; s++ {
				n := 0
				for u := range units {
					if u%shards == s-1 {
						n++
					}
				}
				if got := sweep.ShardUnits(units, s, shards); got != n {
					t.Fatalf("shard %d of %d of %d units: %d, want %d", s, shards, units, got, n)
				}
				sum += n
			}
			if sum != units {
				t.Fatalf("%d units in %d shards: %d", units, shards, sum)
			}
		}
	}
}

func TestMaxArraySize(t *testing.T) {
	for config, want := range map[string]int{
		"LaunchParameters        = (null)\nMaxArraySize            = 4001\nMaxBatchRequeue         = 5\n": 4001,
		"MaxArraySize = 0\n": DefaultMaxArraySize, // arrays are switched off: nothing to go by
		"":                   DefaultMaxArraySize,
		"slurm_load_ctl_conf error: Unable to contact slurm controller": DefaultMaxArraySize,
	} {
		if got := MaxArraySize(config); got != want {
			t.Errorf("%q: %d, want %d", config, got, want)
		}
	}
}

// TestList reads back what List writes.
func TestList(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for range 500 {
		var numbers []int
		for n := 1; n < 60; n++ {
			if r.IntN(3) > 0 {
				numbers = append(numbers, n)
			}
		}
		var back []int
		for part := range strings.SplitSeq(List(numbers), ",") {
			from, to, isRange := strings.Cut(part, "-")
			a, _ := strconv.Atoi(from)
			b := a
			if isRange {
				b, _ = strconv.Atoi(to)
			}
			for n := a; n <= b; n++ {
				back = append(back, n)
			}
		}
		if fmt.Sprint(back) != fmt.Sprint(numbers) {
			t.Fatalf("%v: %s", numbers, List(numbers))
		}
	}
	if got := List([]int{3, 7, 8, 9, 11, 12}); got != "3,7-9,11-12" {
		t.Error(got)
	}
}
