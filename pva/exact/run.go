package exact

import (
	"context"
	"math"

	"ebbline/pva"
	"ebbline/pva/rates"
)

// setting is one choice of grid and quadrature.
type setting struct {
	top   int     // the largest state
	order int     // quadrature points an axis of the weather
	bound float64 // of the rational approximation, see stepsFor
	keep  bool    // kernels are kept for later years
}

// run carries the laws of one case through its years. The state is a batch of
// three laws a point of the weather's grid (one point where years are
// independent): of N, of N of those not yet fallen, and of what went beyond top
// before it fell, put back at top: its later falls bound the error of cutting there.
type run struct {
	setting
	m       *rates.Model
	c       *pva.Case
	climate climate
	always  bool

	split   split       // the weather's grid
	grid    []point     // with memory: its points
	between [][]float64 // with memory: mehler's matrix of one axis

	acts    *store[*kernel]
	lives   *store[[]*kernel] // survivors, by outer point
	young   *store[[]*kernel] // births, by point
	whole   *store[[]*kernel] // both at once
	flows   *store[[]*flowPart]
	factors []float64 // products of births_times that can come together

	fallen, backFallen float64 // gone from the second and third laws
	outgrown, outAlive float64 // passed stop_above: of all, of those not fallen
	lost               float64 // of all, put back at top for good
}

// found is what a run computes.
type found struct {
	fallen, extinct, mean []float64
	last                  batch   // the state after the last year
	cutting               float64 // bound on the error of cutting the states at top
}

const perPoint = 3

func newRun(m *rates.Model, s setting) *run {
	r := &run{setting: s, m: m, c: m.Case, climate: climateOf(m), always: m.Case.Question.Watch == "always",
		acts: newStore[*kernel](), lives: newStore[[]*kernel](), young: newStore[[]*kernel](),
		whole: newStore[[]*kernel](), flows: newStore[[]*flowPart](), factors: factorsOf(m.Case)}
	if r.climate.memory != 0 {
		rule := gauss(s.order)
		r.split = r.climate.grid(rule)
		r.grid = r.split.points()
		r.between = mehler(rule, r.climate.memory)
	} else {
		r.split = r.climate.grid(normalNodes(s.order))
	}
	for y := 1; y <= r.c.Question.Horizon; y++ {
		for range r.factors {
			r.announceActs(y)
		}
		for _, f := range r.factors {
			r.announceYear(y, f)
		}
	}
	return r
}

// factorsOf lists every product of births_times that catastrophes can bring.
func factorsOf(c *pva.Case) []float64 {
	out := []float64{1}
	for _, k := range c.Catastrophe {
		if k.Prob() == 0 || k.BirthsTimes == 1 {
			continue
		}
		for _, f := range append([]float64(nil), out...) {
			out = addFactor(out, f*k.BirthsTimes)
		}
	}
	return out
}

func addFactor(list []float64, f float64) []float64 {
	if factorAt(list, f) < 0 {
		list = append(list, f)
	}
	return list
}

// factorAt finds a factor, but for rounding.
func factorAt(list []float64, f float64) int {
	for i, v := range list {
		if math.Abs(v-f) <= 1e-12*math.Abs(v) {
			return i
		}
	}
	return -1
}

// solve goes through the years.
func (r *run) solve(ctx context.Context) (*found, error) {
	b := r.start()
	out := &found{}
	for y := 1; y <= r.c.Question.Horizon; y++ {
		b = r.year(ctx, y, b)
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		r.census(b, out)
	}
	out.last = b
	out.cutting = r.backFallen
	return out, nil
}

// start is the state before year 1.
func (r *run) start() batch {
	p, beyond := startLaw(r.c, r.top)
	points := max(1, len(r.grid))
	b := newBatch(perPoint*points, r.top)
	over := make([]float64, len(b))
	for j := 0; j < points; j++ {
		w := 1.0
		if r.grid != nil {
			w = r.grid[j].weight
		}
		for n, v := range p {
			b[perPoint*j][n], b[perPoint*j+1][n] = w*v, w*v
		}
		over[perPoint*j], over[perPoint*j+1] = w*beyond, w*beyond
	}
	r.settle(b, over, false)
	r.outgrow(b)
	if r.always {
		r.look(b)
	}
	return b
}

// settle deals with what went beyond top. Where that is beyond stop_above too
// it is outgrown. Otherwise it is put back at top: in the first law with a note
// of how much, in the second by moving it to the third, unless it is to be cut
// to the ceiling before anything else can see it.
func (r *run) settle(b batch, over []float64, unseen bool) {
	outgrows := r.c.Run.StopAbove <= float64(r.top)+1
	for i, x := range over {
		over[i] = 0
		if x == 0 {
			continue
		}
		switch kind := i % perPoint; {
		case outgrows && kind == 0:
			r.outgrown += x
		case outgrows && kind == 1:
			r.outAlive += x
		case outgrows:
		case kind == 1 && !unseen:
			b[i+1][r.top] += x
		default:
			b[i][r.top] += x
			if kind == 0 && !r.c.Ceiling.Set {
				r.lost += math.Abs(x)
			}
		}
	}
}

// cutTo is the ceiling. What was put back at top and is cut to the ceiling
// would have been cut to it from above top too, since a larger population stays
// the larger under the same chances: it rejoins the second law.
func (r *run) cutTo(b batch) {
	most := int(math.Min(math.Floor(r.c.Ceiling.Value), float64(r.top)))
	for _, v := range b {
		for n := most + 1; n <= r.top; n++ {
			v[most] += v[n]
			v[n] = 0
		}
	}
	if math.Floor(r.c.Ceiling.Value) > float64(r.top) {
		return
	}
	for i := 1; i < len(b); i += perPoint {
		b[i][most] += b[i+1][most]
		b[i+1][most] = 0
	}
}

// look takes those at or below the threshold out of the laws of the not fallen.
func (r *run) look(b batch) {
	last := min(int(math.Floor(r.c.Question.Threshold)), r.top)
	for i, v := range b {
		kind := i % perPoint
		if kind == 0 {
			continue
		}
		for n := 0; n <= last; n++ {
			if kind == 1 {
				r.fallen += v[n]
			} else {
				r.backFallen += v[n]
			}
			v[n] = 0
		}
	}
}

// outgrow takes those above stop_above out of every law.
func (r *run) outgrow(b batch) {
	if r.c.Run.StopAbove >= float64(r.top) {
		return
	}
	for i, v := range b {
		for n := int(math.Floor(r.c.Run.StopAbove)) + 1; n <= r.top; n++ {
			switch i % perPoint {
			case 0:
				r.outgrown += v[n]
			case 1:
				r.outAlive += v[n]
			}
			v[n] = 0
		}
	}
}

// census writes down a year.
func (r *run) census(b batch, out *found) {
	r.look(b)
	none, mass, sum := 0.0, 0.0, 0.0
	for i := 0; i < len(b); i += perPoint {
		none += b[i][0]
		for n, p := range b[i] {
			mass += p
			sum += p * float64(n)
		}
	}
	mean := sum / mass
	if r.lost > meanLoss {
		mean = math.NaN()
	}
	out.fallen = append(out.fallen, r.fallen+r.backFallen)
	out.extinct = append(out.extinct, none)
	out.mean = append(out.mean, mean)
}

// meanLoss is the mass put back to the largest state from which on no mean is given.
const meanLoss = 1e-6
