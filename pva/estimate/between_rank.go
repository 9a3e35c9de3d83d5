package estimate

import (
	"math"
	"sort"

	"gonum.org/v1/gonum/mat"

	"ebbline/pva"
)

// PartialRanks is, for each input, its partial rank correlation coefficient with
// the outcome over the draws, the other inputs held: the partial correlation of
// the ranks (Kendall 1942, Biometrika 32:277; for inputs of simulations McKay,
// Conover & Whiteman 1976, Los Alamos LA-NUREG-6526-MS, and Iman & Helton 1988,
// Risk Anal. 8:71). inputs is by draw and input, outcome by draw; equal values
// share the mean of their ranks.
//
// The interval is Fisher's (1915, 1924) on the scale of the inverse hyperbolic
// tangent, with the variance of rank correlations 1.06/(n-3) of Fieller, Hartley
// & Pearson (1957, Biometrika 44:470), n less by one for each input held.
//
// Replicate noise in the outcome draws the coefficients towards 0.
func PartialRanks(inputs [][]float64, outcome []float64, confidence float64) []pva.Correlation {
	if len(inputs) == 0 {
		return nil
	}
	n, k := len(outcome), len(inputs[0])
	columns := make([][]float64, k+1)
	for j := range k {
		columns[j] = meanRanks(n, func(i int) float64 { return inputs[i][j] })
	}
	columns[k] = meanRanks(n, func(i int) float64 { return outcome[i] })
	all := make([][]float64, k+1)
	for a := range columns {
		all[a] = make([]float64, k+1)
		for b := range columns {
			all[a][b] = correlation(columns[a], columns[b])
		}
	}
	out := make([]pva.Correlation, k)
	free := float64(n - 3 - (k - 1))
	for j := range out {
		r := partial(all, j)
		out[j] = pva.Correlation{Estimate: r, Low: -1, High: 1}
		if free > 0 && !math.IsNaN(r) {
			half := twoSided(confidence) * math.Sqrt(1.06/free)
			out[j].Low, out[j].High = math.Tanh(math.Atanh(r)-half), math.Tanh(math.Atanh(r)+half)
		}
		if n < k+2 {
			out[j].Estimate = math.NaN()
		}
	}
	return out
}

// leftOver is the least part of a variance of 1 that still counts as left over
// when the other inputs have explained what they can.
const leftOver = 1e-9

// partial is the partial correlation of input j and the outcome, the last row,
// with the other inputs held; NaN where one of the two, or an input held, is a
// constant or follows from the (other) inputs held.
func partial(all [][]float64, j int) float64 {
	last := len(all) - 1
	var held []int
	for i := range last {
		if i != j {
			held = append(held, i)
		}
	}
	rest := func(a, b int) float64 { return all[a][b] }
	if len(held) > 0 {
		m := mat.NewSymDense(len(held), nil)
		for a, x := range held {
			for b, y := range held {
				if math.IsNaN(all[x][y]) {
					return math.NaN()
				}
				m.SetSym(a, b, all[x][y])
			}
		}
		var factors mat.Cholesky
		if !factors.Factorize(m) || factors.Cond() > 1/leftOver {
			return math.NaN()
		}
		rest = func(a, b int) float64 {
			x, y := mat.NewVecDense(len(held), nil), mat.NewVecDense(len(held), nil)
			for i, h := range held {
				x.SetVec(i, all[a][h])
				y.SetVec(i, all[b][h])
			}
			var solved mat.VecDense
			if err := factors.SolveVecTo(&solved, y); err != nil {
				return math.NaN()
			}
			return all[a][b] - mat.Dot(x, &solved)
		}
	}
	of, to := rest(j, j), rest(last, last)
	if !(of > leftOver && to > leftOver) {
		return math.NaN()
	}
	return math.Max(-1, math.Min(1, rest(j, last)/math.Sqrt(of*to)))
}

// correlation is Pearson's coefficient of two columns of ranks, whose mean is
// (n+1)/2 with or without equal values; NaN if one of the columns is constant.
func correlation(x, y []float64) float64 {
	mean := float64(len(x)+1) / 2
	xx, yy, xy := 0.0, 0.0, 0.0
	for i := range x {
		xx += (x[i] - mean) * (x[i] - mean)
		yy += (y[i] - mean) * (y[i] - mean)
		xy += (x[i] - mean) * (y[i] - mean)
	}
	return xy / math.Sqrt(xx*yy)
}

// meanRanks are ranks from 1 in ascending order, equal values sharing the mean of theirs.
func meanRanks(n int, value func(i int) float64) []float64 {
	index := make([]int, n)
	for i := range index {
		index[i] = i
	}
	sort.SliceStable(index, func(a, b int) bool { return value(index[a]) < value(index[b]) })
	out := make([]float64, n)
	for from := 0; from < n; {
		to := from + 1
		for to < n && value(index[to]) == value(index[from]) {
			to++
		}
		for i := from; i < to; i++ {
			out[index[i]] = float64(from+to+1) / 2
		}
		from = to
	}
	return out
}
