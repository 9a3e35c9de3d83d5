package pva

import "math/bits"

// Histogram counts whole numbers from 0: exactly below 4096, then in 2048 bins
// an octave (a bin is at most 0.05 % wide). Pages of 256 bins are made when
// first touched, so that memory follows the spread of the values and not the
// number of replicates. The zero Histogram is empty and ready.
type Histogram struct {
	pages []*[pageBins]uint32
	total int64
}

const (
	exactBins  = 4096 // values below this have a bin each
	octaveBins = 2048
	pageBins   = 256
)

// BinOf is the bin of value v; negative values are a bug and panic.
func BinOf(v int64) int {
	if v < exactBins {
		if v < 0 {
			panic("pva: negative number in a histogram")
		}
		return int(v)
	}
	shift := bits.Len64(uint64(v)) - 12 // v>>shift is in [2048, 4096)
	return exactBins + (shift-1)*octaveBins + int(v>>shift) - octaveBins
}

// BinLow is the smallest value of a bin; BinLow(bin+1) - 1 is its largest.
func BinLow(bin int) int64 {
	if bin < exactBins {
		return int64(bin)
	}
	shift := (bin-exactBins)/octaveBins + 1
	return int64((bin-exactBins)%octaveBins+octaveBins) << shift
}

// Add counts value v once.
func (h *Histogram) Add(v int64) { h.AddBin(BinOf(v), 1) }

// AddBin counts n values in a bin.
func (h *Histogram) AddBin(bin int, n uint32) {
	page := bin / pageBins
	if page >= len(h.pages) {
		grown := make([]*[pageBins]uint32, page+1)
		copy(grown, h.pages)
		h.pages = grown
	}
	if h.pages[page] == nil {
		h.pages[page] = new([pageBins]uint32)
	}
	h.pages[page][bin%pageBins] += n
	h.total += int64(n)
}

// Total is how many values were counted.
func (h *Histogram) Total() int64 { return h.total }

// Each calls f for every bin that holds values, in ascending order.
func (h *Histogram) Each(f func(bin int, count int64)) {
	for p, page := range h.pages {
		if page == nil {
			continue
		}
		for i, n := range page {
			if n > 0 {
				f(p*pageBins+i, int64(n))
			}
		}
	}
}

// Merge adds the counts of another histogram.
func (h *Histogram) Merge(o *Histogram) {
	o.Each(func(bin int, n int64) { h.AddBin(bin, uint32(n)) })
}

// AtOrBelow counts the values at or below v; where v lies inside a bin wider
// than one value the whole bin is counted.
func (h *Histogram) AtOrBelow(v int64) int64 {
	if v < 0 {
		return 0
	}
	last, sum := BinOf(v), int64(0)
	h.Each(func(bin int, n int64) {
		if bin <= last {
			sum += n
		}
	})
	return sum
}

// Rank is the smallest value v with at least k values at or below it (k from 1
// to Total), the middle of its bin where a bin is wider than one value. It
// returns -1 if k is beyond the total.
func (h *Histogram) Rank(k int64) int64 {
	at, sum := int64(-1), int64(0)
	h.Each(func(bin int, n int64) {
		if at < 0 && sum+n >= k {
			lo, hi := BinLow(bin), BinLow(bin+1)-1
			at = lo + (hi-lo)/2
		}
		sum += n
	})
	return at
}
