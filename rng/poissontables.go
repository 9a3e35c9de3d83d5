package rng

// poissonCoarse[j] draws from the Poisson law of mean 8j, j = 1 to 16, and
// poissonFine[i] from that of mean i/16, i = 1 to 127. What lies beyond the last
// cell has a chance below 2^-64.
var (
	poissonCoarse = buildPoissonCoarse()
	poissonFine   = buildPoissonFine()
)

func buildPoissonCoarse() *[17]alias256 {
	t := new([17]alias256)
	for j := 1; j < len(t); j++ {
		fillAlias(t[j][:], poissonWeights(uint64(8*j), 1, len(t[j])))
	}
	return t
}

func buildPoissonFine() *[128]alias64 {
	t := new([128]alias64)
	for i := 1; i < len(t); i++ {
		fillAlias(t[i][:], poissonWeights(uint64(i), 16, len(t[i])))
	}
	return t
}

// poissonWeights are the probabilities of 0, 1, ..., size-1 at mean num/den, as
// whole multiples of 2^-64. They are built from the mode outwards in 128-bit
// whole numbers, P(k) = P(k-1) mean/k, so that no rounding of a floating
// point enters.
func poissonWeights(num, den uint64, size int) []uint64 {
	rel := make([]wide, size)
	mode := int(num / den)
	rel[mode] = wide{1 << 40, 0}
	for k := mode; k > 0 && rel[k] != (wide{}); k-- {
		rel[k-1] = rel[k].mulDiv(uint64(k)*den, num)
	}
	for k := mode + 1; k < size && rel[k-1] != (wide{}); k++ {
		rel[k] = rel[k-1].mulDiv(num, uint64(k)*den)
	}
	return unitWeights(rel, mode)
}
