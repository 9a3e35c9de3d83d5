package fit

import (
	"math"

	"gonum.org/v1/gonum/stat/distuv"
)

// Split is the variance of the changes parted into process and observation
// error by a Gaussian state-space model of the log counts.
type Split struct {
	Method      string   // "maximum likelihood" or "restricted maximum likelihood"
	Stated      bool     // the errors of the counts were stated, and none is estimated
	Mu          Estimate // mean log growth a year; normal interval
	Process     Estimate // variance a year; interval from the profile of the likelihood
	Observation Estimate // variance of a log count; likewise; NaN where Stated
	LogLik      float64  // restricted where the method is
	// Share is the part of the variance of a change over one unit of time that
	// observation error makes up, with its interval from the profile; NaN where
	// Stated.
	Share Estimate
	// Apart says whether process and observation error can be told apart: the
	// interval of Share leaves out 0, or does not reach one half.
	Apart bool
	// Last is the abundance behind the last count with these variances.
	Last State
}

// noGain is a difference of log likelihoods that is rounding alone.
const noGain = 1e-11

// fitSplit fits by maximum likelihood or by its restricted form.
func fitSplit(p *prepared, restricted bool, confidence float64) *Split {
	s := &splitter{p: p, restricted: restricted}
	s.half = 0.5 * distuv.ChiSquared{K: 1}.Quantile(confidence)
	out := &Split{Method: "maximum likelihood", Stated: p.known != nil, Apart: true}
	if restricted {
		out.Method = "restricted maximum likelihood"
	}
	nan := math.NaN()
	if out.Stated {
		s.scale = s.spread()
		best, fx, _ := lowest(func(x float64) float64 { return -s.at(x*s.scale, 0) }, unitGrid(4))
		s.best = -fx
		if s.at(0, 0) >= s.best-noGain {
			best = 0
		}
		out.Process = Estimate{best * s.scale, 0, 0, nan}
		out.Process.Low, out.Process.High = s.ends(out.Process.Value, func(v float64) float64 { return s.at(v, 0) })
		out.Observation = Estimate{nan, nan, nan, nan}
		out.Share = out.Observation
		out.finish(s, 0, confidence)
		return out
	}
	// Without stated errors the variances only scale together: their ratio is
	// searched, and the scale follows in closed form.
	share, fx, _ := lowest(func(x float64) float64 { v, _ := s.ratio(x); return -v }, unitGrid(1))
	s.best = -fx
	// A share that gains nothing over an edge of the range is that edge.
	if none, _ := s.ratio(0); none >= s.best-noGain {
		share = 0
	} else if all, _ := s.ratio(1); all >= s.best-noGain {
		share = 1
	}
	_, c := s.ratio(share)
	out.Process.Value, out.Observation.Value = (1-share)*c, share*c
	out.Process.SE, out.Observation.SE = nan, nan
	s.scale = 2 * c
	profileProcess := func(v float64) float64 {
		_, fx, _ := lowest(func(x float64) float64 { return -s.at(v, x*s.scale) }, unitGrid(4))
		return -fx
	}
	profileObservation := func(v float64) float64 {
		_, fx, _ := lowest(func(x float64) float64 { return -s.at(x*s.scale, v) }, unitGrid(4))
		return -fx
	}
	out.Process.Low, out.Process.High = s.ends(out.Process.Value, profileProcess)
	out.Observation.Low, out.Observation.High = s.ends(out.Observation.Value, profileObservation)
	of := func(x float64) float64 { return 2 * x / (1 + x) } // 2 t2 / (s2 + 2 t2)
	low, high := s.shareEnds(share)
	out.Share = Estimate{of(share), of(low), of(high), nan}
	out.Apart = out.Share.Low > 0 || out.Share.High < 0.5
	out.finish(s, out.Observation.Value, confidence)
	return out
}

func (out *Split) finish(s *splitter, observation, confidence float64) {
	f := filter(s.p, out.Process.Value, observation)
	z := normalQuantile(confidence)
	out.Mu = Estimate{f.mu, f.mu - z*f.se, f.mu + z*f.se, f.se}
	out.LogLik = s.best
	out.Last = State{f.last, f.spread}
}

// splitter holds what the searches share.
type splitter struct {
	p          *prepared
	restricted bool
	best       float64 // the greatest log likelihood
	half       float64 // by how much it falls at the ends of an interval
	scale      float64 // of variances searched
}

// at is the log likelihood at two variances; -Inf where both are 0.
func (s *splitter) at(process, observation float64) float64 {
	if process <= 0 && observation <= 0 && s.p.known == nil {
		return math.Inf(-1)
	}
	f := filter(s.p, process, observation)
	v := f.logLik
	if s.restricted {
		v = f.reml
	}
	if math.IsNaN(v) {
		return math.Inf(-1)
	}
	return v
}

// ratio is the greatest log likelihood with a share x of process + observation
// being observation, and that sum.
func (s *splitter) ratio(x float64) (logLik, sum float64) {
	f := filter(s.p, 1-x, x)
	n := float64(f.changes)
	if s.restricted {
		sum = f.squares / (n - 1)
		return -0.5 * ((n-1)*(math.Log(2*math.Pi*sum)+1) + f.logs + f.restrict), sum
	}
	sum = f.squares / n
	return -0.5 * (n*(math.Log(2*math.Pi*sum)+1) + f.logs), sum
}

// spread is a variance a year that the process cannot far exceed.
func (s *splitter) spread() float64 {
	v := 0.0
	for i := 0; i < s.p.steps(); i++ {
		w := s.p.y[i+1] - s.p.y[i]
		v += w * w / s.p.tau(i)
	}
	return v / float64(s.p.steps())
}

// unitGrid is 0, then finer towards 0, to most.
func unitGrid(most float64) []float64 {
	grid := []float64{0}
	for x := -7.0; x < -1; x += 0.5 {
		grid = append(grid, math.Pow(10, x))
	}
	for i := 1; i <= 20; i++ {
		grid = append(grid, most*math.Max(0.1/most, float64(i)/20))
	}
	out := grid[:1]
	for _, g := range grid[1:] {
		if g > out[len(out)-1] {
			out = append(out, g)
		}
	}
	return out
}

// ends are the values below and above the best one at which the profile has
// fallen by half; 0 where it never falls so far below.
func (s *splitter) ends(best float64, profile func(float64) float64) (low, high float64) {
	inside := func(v float64) bool { return profile(v) >= s.best-s.half }
	unit := math.Max(best, s.scale*1e-3)
	if low = 0; best > 0 && !inside(0) {
		low = edge(best, 0, inside)
	}
	out := 2 * unit
	for i := 0; i < 60 && inside(out); i++ {
		out *= 2
	}
	return low, edge(math.Max(best, 0), out, inside)
}

// shareEnds are the ends of the interval of the observation's part.
func (s *splitter) shareEnds(best float64) (low, high float64) {
	inside := func(x float64) bool { v, _ := s.ratio(x); return v >= s.best-s.half }
	low, high = 0, 1
	if !inside(0) {
		low = edge(best, 0, inside)
	}
	if !inside(1) {
		high = edge(best, 1, inside)
	}
	return low, high
}

// edge is where inside turns false between in and out.
func edge(in, out float64, inside func(float64) bool) float64 {
	for i := 0; i < 40; i++ {
		if mid := (in + out) / 2; inside(mid) {
			in = mid
		} else {
			out = mid
		}
	}
	return (in + out) / 2
}
