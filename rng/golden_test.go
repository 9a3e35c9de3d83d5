package rng

import (
	"math"
	"slices"
	"testing"
)

// Do not change these numbers: they are the contract of the package. Changing
// them is a change of every result, and the log of changes must say "draws
// changed".

var goldenSeeds = []struct {
	seed, replicate uint64
	purpose         Purpose
	first, second   uint64
}{
	{0, 0, Start, 0x38e8f013c4db7f7c, 0x1bd3c6ac055976e7},
	{1, 0, Weather, 0x82e1384b8977b4c4, 0x861827dd2c0d67c9},
	{0, 1, Weather, 0x789cad3dcf37943, 0x49d1b473ae90d7c0},
	{1, 2, Catastrophes, 0x3e20e397b880a8a0, 0x22a24afa4802c55e},
	{2, 1, Catastrophes, 0x877c3a8a4fb06915, 0x40af5d68cd25aedc},
	{42, 1000000, Demography, 0xdeeff641d3d051d7, 0xcec37a7a02de9798},
	{1 << 63, 7, Survey, 0xc36c914fa3a1f3e1, 0xdd79c6f93c4f4379},
	{^uint64(0), ^uint64(0), Taking, 0x28f17480721456f2, 0x733fadf2ecd232a6},
	{12345, 64, Stocking, 0x686863c13da76a04, 0x79baafae1f697a2e},
	{12345, 64, Inputs, 0x11acbf07b4977f94, 0x2f2b3e1c7903aafb},
	{12345, 64, Resample, 0x908c00a1f8e7177a, 0x25c60b3a05c880},
}

// goldenCounts holds a few draws for every branch of every sampler of counts.
// Where a branch is rare, the draws are so many that the stream passes through
// it, and the last number is the sum of all.
var goldenCounts = []struct {
	branch string
	draw   func(*Stream) int64
	total  int // draws in the sum
	want   []int64
}{
	{"halves: bits of one word", func(s *Stream) int64 { return halves(s, 50) }, 100, []int64{29, 25, 29, 25, 30, 2553}},
	{"halves: table and rest", func(s *Stream) int64 { return halves(s, 200) }, 100, []int64{110, 98, 91, 88, 115, 9947}},
	{"halves: table in the middle of its values", func(s *Stream) int64 { return halves(s, 400) }, 100, []int64{198, 211, 185, 193, 188, 19995}},
	{"binomial: words", func(s *Stream) int64 { return Binomial(s, 6, 0.3) }, 100, []int64{0, 4, 2, 2, 4, 183}},
	{"binomial: digits by mask", func(s *Stream) int64 { return Binomial(s, 32, 0.3) }, 100, []int64{14, 13, 10, 8, 9, 951}},
	{"binomial: digits by one count", func(s *Stream) int64 { return Binomial(s, 64, 0.9) }, 100, []int64{59, 62, 56, 63, 60, 5807}},
	{"binomial: digits by tables", func(s *Stream) int64 { return Binomial(s, 447, 0.71) }, 100, []int64{307, 328, 320, 309, 323, 31719}},
	{"binomial: inversion, small n", func(s *Stream) int64 { return Binomial(s, 10, 0.02) }, 1000, []int64{0, 2, 0, 0, 0, 186}},
	{"binomial: inversion, tiny p", func(s *Stream) int64 { return Binomial(s, 3, 1e-4) }, 100000, []int64{0, 0, 0, 0, 0, 30}},
	{"binomial: inversion, large n", func(s *Stream) int64 { return Binomial(s, 100000, 2e-6) }, 1000, []int64{0, 0, 1, 0, 0, 188}},
	{"binomial: inversion, mirrored", func(s *Stream) int64 { return Binomial(s, 100000, 1-2e-6) }, 1000, []int64{99999, 100000, 100000, 100000, 99999, 99999785}},
	{"binomial: scatter, hits that seldom meet", func(s *Stream) int64 { return Binomial(s, 100000, 5e-5) }, 1000, []int64{7, 4, 6, 3, 4, 4919}},
	{"binomial: rejection", func(s *Stream) int64 { return Binomial(s, 512, 0.3) }, 1000, []int64{167, 152, 143, 134, 162, 153581}},
	{"binomial: rejection, mirrored", func(s *Stream) int64 { return Binomial(s, 4096, 0.9) }, 1000, []int64{3670, 3697, 3695, 3666, 3654, 3686712}},
	{"binomial: rejection, few successes", func(s *Stream) int64 { return Binomial(s, 1000, 0.026) }, 10000, []int64{34, 28, 33, 27, 16, 259721}},
	{"binomial: rejection, huge", func(s *Stream) int64 { return Binomial(s, 1<<40, 0.3) }, 1000, []int64{329853760527, 329853215576, 329852816834, 329853644861, 329852655906, 329853489633316}},
	{"poisson: rest only", func(s *Stream) int64 { return Poisson(s, 0.06) }, 1000, []int64{0, 1, 0, 0, 0, 61}},
	{"poisson: fine part and rest", func(s *Stream) int64 { return Poisson(s, 7.5) }, 100, []int64{9, 9, 4, 10, 6, 733}},
	{"poisson: coarse part alone", func(s *Stream) int64 { return Poisson(s, 64) }, 100, []int64{44, 63, 82, 61, 65, 6456}},
	{"poisson: all parts", func(s *Stream) int64 { return Poisson(s, 393.57) }, 100, []int64{398, 395, 384, 386, 442, 39477}},
	{"poisson: rejection", func(s *Stream) int64 { return Poisson(s, 1024) }, 1000, []int64{1062, 1018, 1042, 1052, 1005, 1024374}},
	{"poisson: rejection, huge", func(s *Stream) int64 { return Poisson(s, 1e12) }, 1000, []int64{999999767474, 1000000751875, 999999400786, 1000002798061, 1000000560720, 999999995054053}},
	{"negative binomial: size below 1", func(s *Stream) int64 { return NegativeBinomial(s, 7.5, 0.5) }, 100, []int64{13, 0, 2, 23, 23, 837}},
	{"negative binomial: size above 1", func(s *Stream) int64 { return NegativeBinomial(s, 150, 2.5) }, 100, []int64{241, 230, 441, 28, 258, 14953}},
	{"negative binomial: vanishing gamma", func(s *Stream) int64 { return NegativeBinomial(s, 1e6, 1e-3) }, 10000, []int64{0, 0, 0, 0, 0, 5212070152}},
	{"negative binomial: beyond the largest mean", func(s *Stream) int64 { return NegativeBinomial(s, 1e12, 1e-4) }, 20000, []int64{0, 0, 0, 0, 0, 32683957173927909}},
	{"geometrics: few", func(s *Stream) int64 { return BirthGeometrics(s, 3, 0.4) }, 100, []int64{2, 0, 2, 2, 3, 203}},
	{"geometrics: many", func(s *Stream) int64 { return BirthGeometrics(s, 5000, 0.3) }, 100, []int64{2076, 2138, 2104, 2067, 2207, 214982}},
	{"round", func(s *Stream) int64 { return Round(s, 15.3) }, 100, []int64{15, 15, 15, 15, 15, 1529}},
	{"round: below zero", func(s *Stream) int64 { return Round(s, -15.3) }, 100, []int64{-15, -15, -15, -15, -15, -1522}},
	{"binomial: scatter, hits that meet", func(s *Stream) int64 { return Binomial(s, 129, 0.04) }, 10000, []int64{2, 2, 5, 7, 4, 51819}},
	{"binomial: scatter, mirrored", func(s *Stream) int64 { return Binomial(s, 590, 0.98) }, 1000, []int64{576, 583, 575, 580, 578, 578215}},
	{"binomial: scatter, huge", func(s *Stream) int64 { return Binomial(s, 1<<40, 1e-7) }, 1000, []int64{110868, 109774, 109938, 109554, 110486, 109957960}},
	{"event: the other", func(s *Stream) int64 { return happens(Event(s, 0.3)) }, 100000, []int64{0, 0, 1, 1, 1, 29964}},
	{"event: a choice of more than 12 bits", func(s *Stream) int64 { return happens(Event(s, 1e-4)) }, 1000000, []int64{0, 0, 0, 0, 0, 113}},
}

// goldenReals: three draws, and the sum of all in units of 2^-20, each rounded
// down: the sum of doubles would depend on nothing else, but is harder to read.
var goldenReals = []struct {
	branch string
	draw   func(*Stream) float64
	total  int
	want   []float64
	sum    int64
}{
	{"float64", (*Stream).Float64, 100, []float64{0.4075871489098205, 0.964888203420395, 0.6546833131261495}, 54662147},
	{"normal: layers, wedges and tails", Normal, 100000, []float64{0.10107892490274875, -0.021171987371487882, 1.5590065551904477}, -843937901},
	{"normal: tail alone", func(s *Stream) float64 { return normalTail(s, -1) }, 100, []float64{-4.01440090562824, -4.501515111774213, -3.9125894324286983}, -407140849},
	{"exponential: layers, wedges and tail", Exponential, 100000, []float64{0.32956294869062613, 1.7525722018533734, 0.31270846067226776}, 105486823755},
	{"gamma: shape below 1", func(s *Stream) float64 { return Gamma(s, 0.3) }, 1000, []float64{0.05730025802204874, 0.1784348856747169, 0.13367408843861192}, 321289625},
	{"gamma: shape 1", func(s *Stream) float64 { return Gamma(s, 1) }, 10000, []float64{0.5401525688740213, 0.22588361178262942, 0.3019730235645946}, 10409118029},
	{"gamma: shape above 1", func(s *Stream) float64 { return Gamma(s, 4.5) }, 10000, []float64{4.5531401812581755, 7.009815596179793, 7.523712558157686}, 47110692375},
	{"gamma: large shape", func(s *Stream) float64 { return Gamma(s, 1e9) / 1e6 }, 10000, []float64{1000.0226581207925, 999.9804656688856, 999.9844052112384}, 10485760165359},
	{"event: waiting time", func(s *Stream) float64 { w, _ := Event(s, 0.3); return w }, 100000, []float64{1.2376800275969462, 0.2952611159633396, 1.0290144885683006}, 105004489981},
}

func happens(_ float64, yes bool) int64 {
	if yes {
		return 1
	}
	return 0
}

func TestGoldenCounts(t *testing.T) {
	for i, c := range goldenCounts {
		s := NewStream(5, uint64(i), Demography)
		var got []int64
		sum := int64(0)
		for j := range c.total {
			k := c.draw(s)
			if j < 5 {
				got = append(got, k)
			}
			sum += k
		}
		got = append(got, sum)
		if !slices.Equal(got, c.want) {
			t.Errorf("%s: %#v, want %#v: draws changed", c.branch, got, c.want)
		}
	}
}

func TestGoldenReals(t *testing.T) {
	for i, c := range goldenReals {
		s := NewStream(6, uint64(i), Weather)
		var got []float64
		sum := int64(0)
		for j := range c.total {
			x := c.draw(s)
			if j < 3 {
				got = append(got, x)
			}
			sum += int64(math.Floor(x * 0x1p20))
		}
		if !slices.Equal(got, c.want) || sum != c.sum {
			t.Errorf("%s: %v and %d, want %v and %d: draws changed", c.branch, got, sum, c.want, c.sum)
		}
	}
}
