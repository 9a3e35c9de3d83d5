package exact

import "math"

// birthDeath is the generator of one year on the states 0 to top, with one
// more state, top+1, that holds what rises above top and never comes back:
// up[n] is the rate from n to n+1, down[n] the rate from n to n-1.
type birthDeath struct {
	up, down []float64 // length top+1
}

// uniform moves laws a year on by uniformisation (Jensen 1953, Skand. Aktuar.
// 36:87-91): a Poisson mixture of powers of a jump matrix, every term positive,
// so that the only error is the tail cut off at 1e-18. Its cost grows with the
// rate of the fastest state; the tests hold the rational approximation against it.
type uniform struct {
	// Chances of a jump to a state from below, from above, and of staying, with
	// one empty state on either side: state n is entry n+1.
	fromBelow, fromAbove, stay []float64
	steps                      int
	weights                    []float64 // of the number of jumps in a step
}

func newUniform(g birthDeath) *uniform {
	n := len(g.up)
	fastest := 1e-300
	for i := range g.up {
		fastest = math.Max(fastest, g.up[i]+g.down[i])
	}
	u := &uniform{fromBelow: make([]float64, n+3), fromAbove: make([]float64, n+3), stay: make([]float64, n+3)}
	for i := range g.up {
		u.fromBelow[i+2] = g.up[i] / fastest
		u.fromAbove[i] = g.down[i] / fastest
		u.stay[i+1] = 1 - (g.up[i]+g.down[i])/fastest
	}
	u.stay[n+1] = 1
	// Steps of mean 100 at most keep the Poisson weights from underflow.
	u.steps = max(1, int(math.Ceil(fastest/100)))
	u.weights = poissonWeights(fastest / float64(u.steps))
	return u
}

func (u *uniform) move(vs batch) {
	n := len(u.stay) - 2
	power, next := make([]float64, n+2), make([]float64, n+2)
	for _, v := range vs {
		for s := 0; s < u.steps; s++ {
			from, to := batch{v}.support()
			if to < from {
				break
			}
			clear(power)
			clear(next)
			copy(power[1:], v)
			for i := range v {
				v[i] *= u.weights[0]
			}
			for _, w := range u.weights[1:] {
				// The span of states with mass grows by one on both sides a jump.
				from, to = max(0, from-1), min(n-1, to+1)
				u.jump(v[from:to+1], next[from+1:to+2], power[from:to+3], from, w)
				power, next = next, power
			}
		}
	}
}

// jump takes one jump: next is from state from on, power from one state below.
func (u *uniform) jump(out, next, power []float64, from int, w float64) {
	below, above, stay := u.fromBelow[from+1:], u.fromAbove[from+1:], u.stay[from+1:]
	m := len(out)
	below, above, stay, next, power = below[:m], above[:m], stay[:m], next[:m], power[:m+2]
	for i := range out {
		x := stay[i]*power[i+1] + below[i]*power[i] + above[i]*power[i+2]
		next[i] = x
		out[i] += w * x
	}
}

// poissonWeights are the chances of a Poisson law from 0 on, cut where what is
// left is below 1e-18, for means up to a few hundred.
func poissonWeights(mean float64) []float64 {
	w := []float64{math.Exp(-mean)}
	for k := 1; ; k++ {
		x := w[k-1] * mean / float64(k)
		w = append(w, x)
		if r := mean / float64(k+1); r < 1 && x < 1e-18*(1-r) {
			return w
		}
	}
}
