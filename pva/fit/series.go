// Package fit turns a series of counts into rates with intervals: growth with
// drift, crowding, the split of process from observation error, the risk that
// the drift model puts on a fall, and a case made from them.
//
// It reads counts, not rates: births and deaths cannot be told apart by counts
// alone, so a case is refused until a survival or a generation time is stated.
// It refuses series too short for an answer, and withholds single answers that
// the counts do not carry, each with its reason. The command `fit` calls it.
package fit

import (
	"errors"
	"fmt"
	"math"
)

// The shortest series that give answers. Four counts leave two degrees of
// freedom for the variance. Ten counts before any risk is stated follow W. F.
// Morris & D. F. Doak 2002, Quantitative Conservation Biology, ch. 3 (from
// memory). Six steps are the fewest at which the corrected criterion of
// Akaike is finite for four parameters (n > k + 1).
const (
	MinimumCounts = 4
	MinimumRisk   = 10
	MinimumSteps  = 6
)

// Count is one count as read.
type Count struct {
	Year  float64 // date, in units of the series' time unit
	Count float64 // as written, not below 0
	// CV is the stated coefficient of variation of the count's own error, 0 if
	// none is stated.
	CV     float64
	Effort float64 // 0 if none is stated
}

// Series is a series of counts in the order of their dates.
type Series struct {
	File       string
	TimeUnit   string // the word for one step: "year" unless the file says otherwise
	Counts     []Count
	NotCounted int  // rows without a count
	Errors     bool // every count has a stated error
	Effort     bool // every count has a stated effort
}

// ZeroRule says what is done with counts of 0, which have no logarithm.
type ZeroRule string

// The rules for zeros: refused; left out as if nobody had counted; or set to
// half of the smallest count above 0 (common practice, no source).
const (
	ZerosRefused ZeroRule = ""
	ZerosMissing ZeroRule = "missing"
	ZerosHalf    ZeroRule = "half"
)

// prepared is a series ready for logarithms: abundances above 0.
type prepared struct {
	file, unit string
	year       []float64
	n          []float64 // abundance: the count, corrected for effort
	y          []float64 // its logarithm
	known      []float64 // stated variance of the error of y; nil if none is stated
	zeros      []float64 // dates of counts of 0
	rule       ZeroRule
	effort     float64 // mean effort, 0 if none is stated
}

// steps is the number of intervals.
func (p *prepared) steps() int { return len(p.y) - 1 }

// tau is the length of interval i, from count i to count i+1.
func (p *prepared) tau(i int) float64 { return p.year[i+1] - p.year[i] }

// span is the time from the first count to the last.
func (p *prepared) span() float64 { return p.year[len(p.year)-1] - p.year[0] }

// last is the last abundance.
func (p *prepared) last() float64 { return p.n[len(p.n)-1] }

// prepare takes logarithms, with zeros and effort dealt with as stated.
func prepare(s *Series, rule ZeroRule) (*prepared, error) {
	p := &prepared{file: s.File, unit: s.TimeUnit, rule: rule}
	smallest := math.Inf(1)
	for _, c := range s.Counts {
		if c.Count == 0 {
			p.zeros = append(p.zeros, c.Year)
			continue
		}
		smallest = math.Min(smallest, c.Count)
	}
	switch {
	case rule != ZerosRefused && rule != ZerosMissing && rule != ZerosHalf:
		return nil, fmt.Errorf("zeros: %q is not known; give missing or half", rule)
	case len(p.zeros) == len(s.Counts):
		return nil, errors.New("counts: none is above 0; there is no growth to fit")
	case len(p.zeros) > 0 && rule == ZerosRefused:
		return nil, fmt.Errorf("counts: %s has a count of 0 (%d in all), which has no logarithm; choose --zeros missing (animals were there and none was seen: as if nobody had counted) or --zeros half (half of the smallest count above 0); if the population was gone and came back, this model does not describe it", dateText(p.zeros[0]), len(p.zeros))
	}
	if s.Effort {
		for _, c := range s.Counts {
			p.effort += c.Effort / float64(len(s.Counts))
		}
	}
	for _, c := range s.Counts {
		n := c.Count
		if n == 0 {
			if rule == ZerosMissing {
				continue
			}
			n = smallest / 2
		}
		if s.Effort {
			n *= p.effort / c.Effort
		}
		p.year = append(p.year, c.Year)
		p.n = append(p.n, n)
		p.y = append(p.y, math.Log(n))
		if s.Errors {
			p.known = append(p.known, math.Log1p(c.CV*c.CV))
		}
	}
	if len(p.n) < MinimumCounts {
		return nil, fmt.Errorf("counts: %d above 0 are too few for a growth and its variance; at least %d are needed", len(p.n), MinimumCounts)
	}
	return p, nil
}

// dateText is a date as written: without decimals if whole.
func dateText(year float64) string { return fmt.Sprintf("%.10g", year) }
