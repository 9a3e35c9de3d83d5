package exact

import "math"

// The exponential of the generator is taken by the order-16 Chebyshev rational
// approximation in incomplete partial fractions (Pusa 2016, Nucl. Sci. Eng.
// 182:297-318; approximation: Cody, Meinardus & Varga 1969): with the poles
// theta and residues alpha below,
//
//	exp(A) p ~ a0 * product over l of (1 + 2 Re(alpha_l (A - theta_l)^-1)) p,
//
// whose error is below 1e-15 on the whole negative real axis. The tests
// evaluate it there, and compare its use with uniformisation.
const cramLimit = 2.124853710495224e-16 // its value at minus infinity

var cramPoles = [8]complex128{
	complex(3.509103608414918, 8.436198985884374),
	complex(5.948152268951177, 3.587457362018322),
	complex(-5.264971343442647, 16.22022147316793),
	complex(1.419375897185666, 10.92536348449672),
	complex(6.416177699099435, 1.194122393370139),
	complex(4.993174737717997, 5.996881713603942),
	complex(-1.413928462488886, 13.49772569889275),
	complex(-10.84391707869699, 19.27744616718165),
}

var cramResidues = [8]complex128{
	complex(5.464930576870210e+3, -3.797983575308356e+4),
	complex(9.045112476907548e+1, -1.115537522430261e+3),
	complex(2.344818070467641e+2, -4.228020157070496e+2),
	complex(9.453304067358312e+1, -2.951294291446048e+2),
	complex(7.283792954673409e+2, -1.205646080220011e+5),
	complex(3.648229059594851e+1, -1.155509621409682e+2),
	complex(2.547321630156819e+1, -2.639500283021502e+1),
	complex(2.394538338734709e+1, -5.650522971778156e+0),
}

// propagator is exp(G/steps) applied steps times, G the generator of a year,
// with every tridiagonal elimination done once and kept.
type propagator struct {
	steps int
	top   int
	super []float64 // down rates a step: entry (n-1, n) of the matrix at n
	pole  [8]struct {
		lower, pivot []complex128 // multipliers of elimination; inverse pivots
	}
}

// newPropagator eliminates the eight shifted matrices of g over a step of a
// year divided by steps.
func newPropagator(g birthDeath, steps int) *propagator {
	n := len(g.up) + 1
	dt := 1 / float64(steps)
	p := &propagator{steps: steps, top: n - 2, super: make([]float64, n)}
	for i, d := range g.down {
		p.super[i] = d * dt
	}
	for l, theta := range cramPoles {
		lower, pivot := make([]complex128, n), make([]complex128, n)
		var inv complex128
		for i := 0; i < n; i++ {
			leave := 0.0
			if i < n-1 {
				leave = (g.up[i] + g.down[i]) * dt
			}
			d := complex(-leave-real(theta), -imag(theta))
			if i > 0 {
				m := complex(g.up[i-1]*dt, 0) * inv
				lower[i] = m
				d -= m * complex(p.super[i], 0)
			}
			s := 1 / (real(d)*real(d) + imag(d)*imag(d))
			inv = complex(real(d)*s, -imag(d)*s)
			pivot[i] = inv
		}
		p.pole[l].lower, p.pole[l].pivot = lower, pivot
	}
	return p
}

// apply replaces the law v on 0..top+1 by its law a year later. Work holds as
// many complex numbers as v has entries.
func (p *propagator) apply(v []float64, work []complex128) {
	n := len(v)
	work = work[:n]
	for s := 0; s < p.steps; s++ {
		for l := range p.pole {
			lower, pivot := p.pole[l].lower[:n], p.pole[l].pivot[:n]
			super := p.super[:n]
			re, im := v[0], 0.0
			work[0] = complex(re, 0)
			for i := 1; i < n; i++ {
				m := lower[i]
				re, im = v[i]-(real(m)*re-imag(m)*im), -(real(m)*im + imag(m)*re)
				work[i] = complex(re, im)
			}
			a := cramResidues[l]
			re, im = 0, 0
			up := 0.0
			for i := n - 1; i >= 0; i-- {
				w, q := work[i], pivot[i]
				re, im = real(w)-up*re, imag(w)-up*im
				re, im = re*real(q)-im*imag(q), re*imag(q)+im*real(q)
				v[i] += 2 * (real(a)*re - imag(a)*im)
				up = super[i]
			}
		}
		for i := range v {
			v[i] *= cramLimit
		}
	}
}

// stepsFor is how many steps a year is cut into. The approximation is sharp
// where the eigenvalues are real, as those of a birth-death chain are, but a
// chain that drifts fast against its noise behaves as if they were not: the
// drift squared over the spread a step must stay small. The bound was found by
// comparison with uniformisation.
func (g birthDeath) stepsFor(bound float64) int {
	worst := 0.0
	for i := range g.up {
		if all := g.up[i] + g.down[i]; all > 0 {
			drift := g.up[i] - g.down[i]
			worst = math.Max(worst, drift*drift/all)
		}
	}
	return max(1, int(math.Ceil(worst/bound)))
}
