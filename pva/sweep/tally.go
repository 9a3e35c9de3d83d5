package sweep

import (
	"encoding/binary"
	"errors"

	"ebbline/pva"
)

// checkpoints is how many years a cell's risk is kept for: the quarters of its
// horizon, the last being the horizon itself.
const checkpoints = 4

// checkpoint is the year of checkpoint k (0 to 3) of a horizon.
func checkpoint(k, horizon int) int { return (horizon*(k+1) + checkpoints - 1) / checkpoints }

// Tally is what the replicates of one cell add up to: whole numbers only, so
// that any order of adding, any shards and any resumption give the same. It is
// light on purpose: a study has up to 100,000 of them.
type Tally struct {
	Replicates int64
	Fallen     [checkpoints]int64 // fallen by each quarter of the horizon
	Extinct    int64              // N = 0 at the last census
	Outgrown   int64
	// KeptYears counts replicate-years not outgrown, over which takes, extra
	// deaths and closed years are summed.
	KeptYears              int64
	Closed                 int64
	Take, Shortfall, Extra pva.Sum
	Last                   pva.Sum // N at the last census of those not outgrown
	Smallest               pva.Sum // smallest census of those that had one
	SmallestOf             int64
	// Discordant replicates at the horizon: fallen here and not in the case,
	// and the other way round; the same against the cell's own baseline.
	OnlyThis, OnlyCase, OnlyThisNotBase, OnlyBase int64
}

// Merge adds another tally.
func (t *Tally) Merge(o *Tally) {
	a, b := t.numbers(), o.numbers()
	for i := range a {
		*a[i] += *b[i]
	}
	s, r := t.sums(), o.sums()
	for i := range s {
		s[i].Merge(*r[i])
	}
}

func (t *Tally) numbers() []*int64 {
	return []*int64{&t.Replicates, &t.Fallen[0], &t.Fallen[1], &t.Fallen[2], &t.Fallen[3], &t.Extinct, &t.Outgrown, &t.KeptYears, &t.Closed,
		&t.SmallestOf, &t.OnlyThis, &t.OnlyCase, &t.OnlyThisNotBase, &t.OnlyBase}
}

func (t *Tally) sums() []*pva.Sum {
	return []*pva.Sum{&t.Take, &t.Shortfall, &t.Extra, &t.Last, &t.Smallest}
}

// append writes the tally as the bytes of a record.
func (t *Tally) append(b []byte) []byte {
	for _, n := range t.numbers() {
		b = binary.AppendVarint(b, *n)
	}
	for _, s := range t.sums() {
		b = binary.AppendVarint(b, s.Hi)
		b = binary.AppendUvarint(b, s.Lo)
	}
	return b
}

var errShort = errors.New("a record is shorter than its tallies")

// read takes a tally off the front of a record.
func (t *Tally) read(b []byte) ([]byte, error) {
	signed := func() (v int64) {
		v, n := binary.Varint(b)
		if n <= 0 {
			b = nil
			return -1
		}
		b = b[n:]
		return v
	}
	for _, n := range t.numbers() {
		if len(b) == 0 {
			return nil, errShort
		}
		*n = signed()
	}
	for _, s := range t.sums() {
		if len(b) == 0 {
			return nil, errShort
		}
		s.Hi = signed()
		lo, n := binary.Uvarint(b)
		if n <= 0 {
			return nil, errShort
		}
		s.Lo, b = lo, b[n:]
	}
	return b, nil
}
