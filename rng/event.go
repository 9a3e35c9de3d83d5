package rng

// The bits of a word that Event uses: 8 for the layer of the ziggurat, 12 for
// the choice, 44 for the place within the layer.
const (
	choiceBits  = 12
	choiceSteps = 1 << choiceBits
)

// eventLayer is a layer of the exponential's ziggurat: the width of a place, its
// edge cut into 2^44, and the edge of its core, side by side in memory.
type eventLayer struct{ step, core float64 }

var eventLayers = buildEventLayers()

func buildEventLayers() *[256]eventLayer {
	t := new([256]eventLayer)
	for i := range t {
		t[i] = eventLayer{exponentialTable.edge[i] * 0x1p-44, exponentialTable.edge[i+1]}
	}
	return t
}

// Event draws what happens next in a chain of events (Gillespie 1977, J. Phys.
// Chem. 81:2340): the waiting time, exponential of mean 1, and, independently,
// whether the event is the one of chance p, from 0 to 1. It mostly makes both of
// one word: 12 bits that the waiting time leaves over decide, unless they are
// equal to the leading 12 bits of p, and then a second word goes on from there,
// so that the chance is p to 2^-64. The waiting time is that of Exponential, on a
// grid of 2^-44 of a layer's width.
func Event(s *Stream, p float64) (wait float64, yes bool) {
	w := s.pcg.Uint64()
	layer := &eventLayers[w&255]
	x := float64((float64(int64(w>>(8+choiceBits))) + 0.5) * layer.step)
	if !(x < layer.core) {
		x = exponentialOutside(s, w&255, x)
	}
	steps := float64(p * choiceSteps)
	whole := int64(steps)
	choice := int64(w >> 8 & (choiceSteps - 1))
	if choice == whole {
		return x, float64(s.pcg.Uint64()>>12)*0x1p-52 < steps-float64(whole)
	}
	return x, choice < whole
}

// exponentialOutside goes on where place x of layer i lies outside its core.
func exponentialOutside(s *Stream, i uint64, x float64) float64 {
	if i == 0 {
		// The law has no memory: beyond the last edge it starts afresh.
		return exponentialFrom + Exponential(s)
	}
	if inLayer(s, i, x) {
		return x
	}
	return Exponential(s)
}
