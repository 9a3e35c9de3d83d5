// Package draws makes the outer draws of a case's uncertain inputs: for each
// draw a value of every number marked [[uncertain]], from its law, with the rank
// correlations of [[uncertain_pair]].
//
// The values are a Latin hypercube (McKay, Beckman & Conover 1979, Technometrics
// 21:239): every input has one value in each of as many slices of equal chance
// as there are draws. They are put into the order that gives the rank
// correlations asked for, and next to none where none is asked for, by the
// method of Iman & Conover (1982, Commun. Stat. B 11:311).
//
// All random numbers come from the streams (seed, draw, Inputs) and from nothing
// else. Because slices are shared out among the draws, a draw's values depend on
// the whole design: on the seed, the number of draws and all laws and pairs of
// the case; a longer design is a new one. Values are rounded to ten significant
// digits, so that the last bits, in which processors may differ, do not matter.
//
// It refuses laws that their own figures do not allow, laws that lie for the
// most part outside what the key may be, and correlations that cannot hold
// together. It runs nothing; package assess calls it.
package draws

import (
	"fmt"
	"math"
	"strconv"

	"ebbline/pva"
	"ebbline/rng"
)

// Input is one uncertain number and its law.
type Input struct {
	Path  string // by position
	Key   string // by name, as a reader knows it
	Words string // the law in words
	Value float64
	// Mean and SD are those of the law, before values that the key cannot have
	// are redrawn.
	Mean, SD float64
	// Outside is how many of the draws had a value of this input that the key
	// cannot have; each was drawn anew from the rest of the law.
	Outside int

	law law
	key *pva.Key
	// from and to are the chances of the law below and up to the end of the
	// key's range: a value is drawn anew at a chance between them.
	from, to float64
}

// Design is the outer draws of a case.
type Design struct {
	Inputs []Input
	// Warnings are doubts about the laws and what was redrawn on account of them.
	Warnings []pva.Warning

	seed    uint64
	values  [][]float64 // by draw and input
	redrawn []bool      // by draw: some value had to be drawn anew
	tries   []int       // by draw: how often Redraw was called
	root    [][]float64 // of the correlations of the normal scores
}

// mostOutside is the share of draws beyond which redrawing is warned of: the law
// is then no longer what the case states.
const mostOutside = 0.05

// New makes the design of a case with uncertain inputs from its run.seed and
// run.draws. The error is pva.Faults about [[uncertain]] and [[uncertain_pair]].
func New(c *pva.Case) (*Design, error) {
	if len(c.Uncertain) == 0 || c.Run.Draws < 1 {
		panic("draws: a case without uncertain inputs or without draws")
	}
	d := &Design{seed: c.Run.Seed}
	var faults pva.Faults
	for i, u := range c.Uncertain {
		in, bad := newInput(c, "uncertain."+strconv.Itoa(i+1)+".", u)
		faults = append(faults, bad...)
		d.Inputs = append(d.Inputs, in)
	}
	if len(faults) > 0 {
		return nil, faults
	}
	root, bad := correlations(c, d.Inputs)
	if len(bad) > 0 {
		return nil, bad
	}
	d.root = root
	d.draw(c.Run.Draws)
	d.doubts()
	return d, nil
}

// Draws is the number of draws.
func (d *Design) Draws() int { return len(d.values) }

// Values are one draw's numbers, in the order of Inputs. They are not to be changed.
func (d *Design) Values(draw int) []float64 { return d.values[draw] }

// Settings put a draw's numbers into a case, in the order of Inputs.
func (d *Design) Settings(draw int) []pva.Setting {
	out := make([]pva.Setting, len(d.Inputs))
	for j, v := range d.values[draw] {
		out[j] = pva.Setting{Path: d.Inputs[j].Path, Value: pva.Num(v)}
	}
	return out
}

// Redrawn is the number of draws of which some value had to be drawn anew, here
// or by Redraw.
func (d *Design) Redrawn() int {
	n := 0
	for _, yes := range d.redrawn {
		if yes {
			n++
		}
	}
	return n
}

// draw fills the design: uniform numbers, slices, ranges, order.
func (d *Design) draw(draws int) {
	k := len(d.Inputs)
	d.values = make([][]float64, draws)
	d.redrawn, d.tries = make([]bool, draws), make([]int, draws)
	// Three uniform numbers an input and draw: its place among the slices, its
	// place in the slice, and a spare for a value outside the key's range.
	uniform := make([][]float64, draws)
	for i := range uniform {
		d.values[i] = make([]float64, k)
		s := rng.NewStream(d.seed, uint64(i), rng.Inputs)
		uniform[i] = make([]float64, perInput*k)
		for j := range uniform[i] {
			uniform[i][j] = s.Float64()
		}
	}
	place := make([][]int, k) // by input and draw: the slice before pairing
	for j := range place {
		place[j] = ranks(draws, func(i int) float64 { return uniform[i][perInput*j] })
	}
	order := arrange(place, d.root)
	for j := range d.Inputs {
		in := &d.Inputs[j]
		slices := make([]float64, draws)
		outside := make([]bool, draws)
		for i := range uniform {
			slice := place[j][i]
			p := (float64(slice) + uniform[i][perInput*j+1]) / float64(draws)
			slices[slice], outside[slice] = in.at(p, uniform[i][perInput*j+2])
			if outside[slice] {
				in.Outside++
			}
		}
		// A value drawn anew has left its slice: the order of pairing is one of
		// ranks, so values are sorted again.
		by := ranks(draws, func(i int) float64 { return slices[i] })
		sorted, flag := make([]float64, draws), make([]bool, draws)
		for i, r := range by {
			sorted[r], flag[r] = slices[i], outside[i]
		}
		for i, r := range order[j] {
			d.values[i][j] = sorted[r]
			d.redrawn[i] = d.redrawn[i] || flag[r]
		}
	}
}

// perInput is how many uniform numbers an input takes from a draw's stream.
const perInput = 3

// mostTries is how often one draw is drawn anew before it is given up.
const mostTries = 200

// Redraw draws all values of one draw anew, for a caller that finds that they
// cannot stand together in a case (a spread too wide for a fraction, say). They
// come from the normal copula of the rank correlations and from the parts of the
// laws that the keys allow. It errs when it has been called too often for the
// draw. It changes nothing of other draws and may be called for different draws
// side by side.
func (d *Design) Redraw(draw int) error {
	if d.tries[draw]++; d.tries[draw] > mostTries {
		return fmt.Errorf("draw %d of the uncertain inputs was drawn anew %d times without making a valid case; the laws and the rest of the case do not go together: give narrower ones", draw+1, mostTries)
	}
	d.redrawn[draw] = true
	k := len(d.Inputs)
	s := rng.NewStream(d.seed, uint64(draw), rng.Inputs)
	for range perInput*k + (d.tries[draw]-1)*k { // what came before
		s.Uint64()
	}
	z := make([]float64, k)
	for j := range z {
		z[j] = standard.Quantile(s.Float64())
	}
	for j := range d.Inputs {
		in := &d.Inputs[j]
		x := 0.0
		for l, v := range z {
			x += d.root[j][l] * v
		}
		d.values[draw][j] = in.within(standard.CDF(x))
	}
	return nil
}

// doubts warns of laws that lose much of themselves to the key's range, and of
// laws that lie beside the value of the case.
func (d *Design) doubts() {
	for _, in := range d.Inputs {
		if n := float64(d.Draws()); float64(in.Outside) > mostOutside*n {
			d.Warnings = append(d.Warnings, pva.Warning{Key: in.Key, Text: fmt.Sprintf(
				"%.0f %% of the draws of its law (%s) lay outside what it may be and were drawn anew, so that the law is not what is stated: choose one that ends there", 100*float64(in.Outside)/n, in.Words)})
		}
		if math.Abs(in.Mean-in.Value) > in.SD {
			d.Warnings = append(d.Warnings, pva.Warning{Key: in.Key, Text: fmt.Sprintf(
				"its law (%s) has mean %.4g and lies beside the value of the case, %.4g: the draws say something else than the case does", in.Words, in.Mean, in.Value)})
		}
	}
}
