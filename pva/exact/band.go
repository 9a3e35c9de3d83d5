package exact

import (
	"context"
	"math"
	"sync"

	"gonum.org/v1/gonum/floats"
)

// batch is a set of laws on the states 0 to top, moved together.
type batch [][]float64

func newBatch(count, top int) batch {
	flat := make([]float64, count*(top+1))
	b := make(batch, count)
	for i := range b {
		b[i] = flat[i*(top+1) : (i+1)*(top+1) : (i+1)*(top+1)]
	}
	return b
}

// scale multiplies every law by w.
func (b batch) scale(w float64) {
	for _, v := range b {
		floats.Scale(w, v)
	}
}

// add adds another batch, w times.
func (b batch) add(w float64, other batch) {
	for i, v := range b {
		floats.AddScaled(v, w, other[i])
	}
}

func (b batch) copy() batch {
	c := newBatch(len(b), len(b[0])-1)
	for i := range b {
		copy(c[i], b[i])
	}
	return c
}

// negligible is a mass that is passed over: with a thousand states and a few
// kernels a year, all that is passed over in a year stays below 1e-15.
const negligible = 1e-19

// support is the span of states where any law has mass; to < from if none has.
func (b batch) support() (from, to int) {
	from, to = len(b[0]), -1
	for _, v := range b {
		i := 0
		for i < from && math.Abs(v[i]) < negligible {
			i++
		}
		from = min(from, i)
		j := len(v) - 1
		for j > to && math.Abs(v[j]) < negligible {
			j--
		}
		to = max(to, j)
	}
	return from, to
}

// law gives the law of the next state from state n: the first state of a run
// and the run, in or beyond buf. It may run beyond top.
type law func(n int, buf []float64) (lo int, row []float64)

// kernel is a chance law from each state, built row by row when first needed
// and kept if it will be used again.
type kernel struct {
	top  int
	law  law
	keep bool
	lo   []int32
	rows [][]float64
	over []float64 // mass of the row beyond top
}

func newKernel(top int, keep bool, l law) *kernel {
	k := &kernel{top: top, law: l, keep: keep}
	if keep {
		k.lo = make([]int32, top+1)
		k.rows = make([][]float64, top+1)
		k.over = make([]float64, top+1)
	}
	return k
}

// row is the law from n, cut at top, and the mass beyond.
func (k *kernel) row(n int, buf []float64) (lo int, row []float64, over float64, grown []float64) {
	if k.keep && k.rows[n] != nil {
		return int(k.lo[n]), k.rows[n], k.over[n], buf
	}
	lo, row = k.law(n, buf[:0])
	if cap(row) > cap(buf) {
		buf = row
	}
	if beyond := lo + len(row) - 1 - k.top; beyond > 0 {
		in := max(0, len(row)-beyond)
		over = floats.Sum(row[in:])
		row = row[:in]
	}
	if lo > k.top {
		lo = k.top
	}
	if k.keep {
		k.lo[n], k.over[n] = int32(lo), over
		k.rows[n] = append(make([]float64, 0, len(row)), row...)
		row = k.rows[n]
	}
	return lo, row, over, buf
}

// apply moves every law of src through the kernel, adds the result times w to
// dst, and the mass that went beyond top to over. The rows are shared out
// between two goroutines by parity, each with its own sum, so that the result
// does not depend on which is faster.
func (k *kernel) apply(ctx context.Context, dst, src batch, w float64, over []float64) {
	from, to := src.support()
	if to < from || ctx.Err() != nil {
		return
	}
	second := newBatch(len(dst), k.top)
	overs := [2][]float64{make([]float64, len(dst)), make([]float64, len(dst))}
	var wait sync.WaitGroup
	part := func(start int, out batch, over []float64) {
		defer wait.Done()
		buf := make([]float64, 0, 1024)
		for n := start; n <= to; n += 2 {
			if n&63 < 2 && ctx.Err() != nil {
				return
			}
			any := false
			for i := range src {
				any = any || math.Abs(src[i][n]) >= negligible
			}
			if !any {
				continue
			}
			var lo int
			var row []float64
			var beyond float64
			lo, row, beyond, buf = k.row(n, buf)
			for i := range src {
				if x := w * src[i][n]; x != 0 {
					floats.AddScaled(out[i][lo:lo+len(row)], x, row)
					over[i] += x * beyond
				}
			}
		}
	}
	wait.Add(2)
	go part(from, dst, overs[0])
	part(from+1, second, overs[1])
	wait.Wait()
	dst.add(1, second)
	for i := range over {
		over[i] += overs[0][i] + overs[1][i]
	}
}

// mixture is the average of several laws, with weights.
func mixture(weights []float64, laws []law) law {
	if len(laws) == 1 && weights[0] == 1 {
		return laws[0]
	}
	return func(n int, buf []float64) (int, []float64) {
		var part []float64
		lo, row := -1, buf[:0]
		for i, l := range laws {
			var at int
			at, part = l(n, part[:0])
			lo, row = addRun(lo, row, at, part, weights[i])
		}
		return lo, row
	}
}

// addRun adds w times a run that starts at from to the run that starts at lo
// (none yet if lo is below 0).
func addRun(lo int, row []float64, from int, part []float64, w float64) (int, []float64) {
	if lo < 0 {
		lo, row = from, row[:0]
	}
	if from < lo { // make room in front
		shift := lo - from
		old := len(row)
		row = lengthen(row, old+shift)
		copy(row[shift:], row[:old])
		for i := 0; i < shift && i < len(row); i++ {
			row[i] = 0
		}
		lo = from
	}
	if need := from - lo + len(part); need > len(row) {
		row = lengthen(row, need)
	}
	floats.AddScaled(row[from-lo:from-lo+len(part)], w, part)
	return lo, row
}

func lengthen(row []float64, n int) []float64 {
	old := len(row)
	if n <= cap(row) {
		row = row[:n]
		for i := old; i < n; i++ {
			row[i] = 0
		}
		return row
	}
	grown := make([]float64, n, n+n/2)
	copy(grown, row)
	return grown
}

// convolve is the law of the sum of two independent runs.
func convolve(buf []float64, loA int, a []float64, loB int, b []float64) (int, []float64) {
	if len(a) > len(b) {
		loA, a, loB, b = loB, b, loA, a
	}
	out := lengthen(buf[:0], len(a)+len(b)-1)
	for i, x := range a {
		if x != 0 {
			floats.AddScaled(out[i:i+len(b)], x, b)
		}
	}
	return loA + loB, out
}
