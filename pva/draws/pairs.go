package draws

import (
	"fmt"
	"math"
	"sort"

	"gonum.org/v1/gonum/mat"

	"ebbline/pva"
)

// correlations turns the rank correlations of a case into those of normal
// scores, 2 sin(pi r / 6) (Pearson 1907; exact for the bivariate normal law), and
// returns a symmetric root of their matrix. Iman & Conover put the rank
// correlation itself there, which falls short of it by up to 0.02.
func correlations(c *pva.Case, inputs []Input) ([][]float64, pva.Faults) {
	k := len(inputs)
	at := map[string]int{}
	for j, in := range inputs {
		at[in.Path] = j
	}
	var pairs []rankPair
	for _, p := range c.UncertainPair {
		one := rankPair{rank: p.RankCorrelation}
		for s, key := range p.Keys {
			path, fault := c.Lookup(key)
			if fault != nil {
				return nil, pva.Faults{*fault}
			}
			one.at[s] = at[path]
		}
		pairs = append(pairs, one)
	}
	root, least := symmetricRoot(scoreMatrix(k, pairs, 1))
	if least >= singular {
		return root, nil
	}
	// The largest part of what is asked for that can be.
	possible, not := 0.0, 1.0
	for range 30 {
		mid := (possible + not) / 2
		if _, least := symmetricRoot(scoreMatrix(k, pairs, mid)); least >= singular {
			possible = mid
		} else {
			not = mid
		}
	}
	return nil, pva.Faults{{Key: "uncertain_pair", Path: "uncertain_pair", Want: "the rank correlations cannot hold together: no draws have all of them at once",
		Fix: fmt.Sprintf("bring them nearer to 0 (about %.2f times what they are is possible), or leave out a pair", math.Floor(100*possible)/100)}}
}

// singular is how far below 0 rounding may put the least eigenvalue of a
// correlation matrix.
const singular = -1e-9

type rankPair struct {
	at   [2]int
	rank float64
}

// scoreMatrix is the correlations of normal scores that give rank correlations
// of so many times those of the pairs.
func scoreMatrix(k int, pairs []rankPair, times float64) *mat.SymDense {
	m := mat.NewSymDense(k, nil)
	for j := range k {
		m.SetSym(j, j, 1)
	}
	for _, p := range pairs {
		m.SetSym(p.at[0], p.at[1], 2*math.Sin(math.Pi*times*p.rank/6))
	}
	return m
}

// symmetricRoot is the symmetric matrix whose square is m, and the least
// eigenvalue of m. Eigenvalues that rounding has put beside 0 count as 0, so
// that correlations of 1 and -1 are allowed.
func symmetricRoot(m *mat.SymDense) ([][]float64, float64) {
	var e mat.EigenSym
	if !e.Factorize(m, true) {
		panic("draws: the eigenvalues of a correlation matrix were not found")
	}
	values := e.Values(nil)
	var v mat.Dense
	e.VectorsTo(&v)
	k := m.SymmetricDim()
	root := make([][]float64, k)
	for i := range root {
		root[i] = make([]float64, k)
		for j := range root[i] {
			for l, x := range values {
				if x > 1e-12 {
					root[i][j] += v.At(i, l) * math.Sqrt(x) * v.At(j, l)
				}
			}
		}
	}
	return root, values[0]
}

// arrange is the method of Iman & Conover (1982): place holds, by input and
// draw, a random order of the slices. Normal scores in these orders are freed of
// the correlations that chance has given them, given those asked for, and ranked:
// the result is, by input and draw, the rank of the value that belongs there.
func arrange(place [][]int, root [][]float64) [][]int {
	k, n := len(place), len(place[0])
	scores := mat.NewDense(n, k, nil)
	for j := range place {
		for i, r := range place[j] {
			scores.Set(i, j, standard.Quantile(float64(r+1)/float64(n+1)))
		}
	}
	mixed := mat.NewDense(n, k, nil)
	to := mat.NewDense(k, k, nil)
	for i := range root {
		to.SetRow(i, root[i])
	}
	if free, ok := freeing(scores); ok {
		mixed.Mul(scores, free)
		mixed.Mul(mixed, to)
	} else {
		mixed.Mul(scores, to)
	}
	out := make([][]int, k)
	for j := range out {
		out[j] = ranks(n, func(i int) float64 { return mixed.At(i, j) })
	}
	return out
}

// freeing is the symmetric matrix that turns columns of scores into uncorrelated
// ones while changing them least; false where there are too few draws for one.
func freeing(scores *mat.Dense) (*mat.Dense, bool) {
	n, k := scores.Dims()
	if n < k+2 {
		return nil, false
	}
	var cross mat.Dense
	cross.Mul(scores.T(), scores)
	m := mat.NewSymDense(k, nil)
	for i := range k {
		for j := i; j < k; j++ {
			m.SetSym(i, j, cross.At(i, j)/math.Sqrt(cross.At(i, i)*cross.At(j, j)))
		}
	}
	root, least := symmetricRoot(m)
	if least < 1e-6 {
		return nil, false
	}
	r := mat.NewDense(k, k, nil)
	for i := range root {
		r.SetRow(i, root[i])
	}
	var inverse mat.Dense
	if err := inverse.Inverse(r); err != nil {
		return nil, false
	}
	return &inverse, true
}

// ranks are the places, from 0, of n values in ascending order; equal values
// keep the order of their indices.
func ranks(n int, value func(i int) float64) []int {
	index := make([]int, n)
	for i := range index {
		index[i] = i
	}
	sort.SliceStable(index, func(a, b int) bool { return value(index[a]) < value(index[b]) })
	out := make([]int, n)
	for r, i := range index {
		out[i] = r
	}
	return out
}
