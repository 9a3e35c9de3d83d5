package sweep

import (
	"context"
	"encoding/binary"
	"errors"
	"fmt"
	"math"
	"math/bits"
	"sync/atomic"

	"ebbline/pva"
	"ebbline/pva/ensemble"
	"ebbline/pva/estimate"
	"ebbline/pva/exact"
	"ebbline/pva/rates"
	"ebbline/pva/year"
)

// axis is a line of cases along which a risk is followed: a take, a size.
type axis struct {
	key, path, unit string
	whole           bool // whole numbers only
	rising          bool // the risk is expected to rise with the value
	from, to        float64
	scan            []float64 // where to look first, from and to among them
	limit           float64
	confidence      float64
	tag             string // tells axes of one ledger apart
	horizon         int
	// model is the case at a value as formulas; or why it has none, which counts
	// as above the limit.
	model func(x float64) (m *rates.Model, unreachable string, err error)
}

// Point is the risk at one value of an axis, and what it rests on.
type Point struct {
	Value   float64
	Risk    pva.Proportion // Low and High hold at every number of replicates at once
	Exact   *pva.ExactAnswer
	Verdict pva.Verdict
	// Unreachable is why there is no such case, "" if there is one. Its Risk then
	// is no estimate: such a value counts as above the limit, whatever that is.
	Unreachable string

	model *rates.Model
	words []uint64 // fallen or not, a bit a replicate
	n     int64    // replicates in words
}

// curve is what is known of the risk along an axis.
type curve struct {
	r      *Runner
	a      axis
	points []*Point // by rising u
	exact  bool     // whether exact answers are wanted where they are cheap
}

// u turns values so that the risk is expected to rise with u.
func (a *axis) u(x float64) float64 {
	if a.rising {
		return x
	}
	return -x
}

// look makes sure that the values given have been looked at: exactly where that
// is cheap, with n replicates elsewhere.
func (c *curve) look(ctx context.Context, values []float64, n int64) error {
	var fresh []*Point
	for _, x := range values {
		if c.at(x) != nil {
			continue
		}
		m, unreachable, err := c.a.model(x)
		if err != nil {
			return fmt.Errorf("%s = %s: %w", c.a.key, pva.Num(x).Text, err)
		}
		p := &Point{Value: x, model: m, Unreachable: unreachable}
		c.insert(p)
		if unreachable != "" {
			p.Risk, p.Verdict = pva.Proportion{Estimate: 1, Low: 1, High: 1}, pva.AboveLimit
			continue
		}
		fresh = append(fresh, p)
	}
	if c.exact {
		err := c.r.each(ctx, len(fresh), func(ctx context.Context, i int) error { return fresh[i].solve(ctx) })
		if err != nil {
			return err
		}
	}
	return c.simulate(ctx, fresh, n)
}

func (c *curve) at(x float64) *Point {
	for _, p := range c.points {
		if p.Value == x {
			return p
		}
	}
	return nil
}

func (c *curve) insert(p *Point) {
	at := len(c.points)
	for i, q := range c.points {
		if c.a.u(p.Value) < c.a.u(q.Value) {
			at = i
			break
		}
	}
	c.points = append(c.points, nil)
	copy(c.points[at+1:], c.points[at:])
	c.points[at] = p
}

// solve gives the point its exact answer if that is cheap.
func (p *Point) solve(ctx context.Context) error {
	ops, ok, _ := exact.CostWith(p.model, exact.Options{Stated: true})
	if !ok || ops > exact.Cheap {
		return nil
	}
	a, err := exact.Solve(ctx, p.model, exact.Options{Stated: true})
	if err != nil || a.Reason != "" {
		return err
	}
	p.Exact = a
	return nil
}

// simulate brings every point without an exact answer up to n replicates, and
// gives all of them their verdicts.
func (c *curve) simulate(ctx context.Context, points []*Point, n int64) error {
	byLength := map[int64][]*Point{}
	var lengths []int64
	for _, p := range points {
		if p.Exact == nil && p.n < n {
			if byLength[p.n] == nil {
				lengths = append(lengths, p.n)
			}
			byLength[p.n] = append(byLength[p.n], p)
		}
	}
	for _, had := range lengths {
		same := byLength[had]
		for len(same) > 0 {
			some := same[:min(len(same), groupCells)]
			same = same[len(some):]
			if err := c.extend(ctx, some, had, n); err != nil {
				return err
			}
		}
	}
	for _, p := range points {
		p.judge(c.a.limit, c.a.confidence)
	}
	return nil
}

// judge holds the point against the limit.
func (p *Point) judge(limit, confidence float64) {
	if e := p.Exact; e != nil {
		p.Risk = pva.Proportion{Estimate: e.Risk, Low: math.Max(0, e.Risk-e.Error), High: math.Min(1, e.Risk+e.Error)}
	} else {
		count := int64(0)
		for _, w := range p.words {
			count += int64(bits.OnesCount64(w))
		}
		s := estimate.NewSequence(confidence)
		s.Update(count, p.n)
		p.Risk = s.Proportion()
	}
	p.Verdict = estimate.Verdict(pva.Optional{Value: limit, Set: true}, p.Risk)
}

// extend simulates points together from replicate had (rounded down to a whole
// block) to n. The work is cut into chunks that go into the ledger one by one.
func (c *curve) extend(ctx context.Context, points []*Point, had, n int64) error {
	from, to := had/ensemble.Lanes, (n+ensemble.Lanes-1)/ensemble.Lanes // blocks
	for _, p := range points {
		p.words = append(p.words[:from:from], make([]uint64, to-from)...)
	}
	ops := opsPerReplicate(points[0].model) * ensemble.Lanes * float64(len(points))
	size := max(4, min(int64(unitOps/ops), (to-from+fewestUnits-1)/fewestUnits))
	chunks := int((to - from + size - 1) / size)
	var done atomic.Int64
	total := (n - from*ensemble.Lanes) * int64(len(points))
	err := c.r.each(ctx, chunks, func(ctx context.Context, i int) error {
		first := from + int64(i)*size
		last := min(to, first+size)
		return c.chunk(ctx, points, first, last, n, func(cells int64) {
			if d := done.Add(cells); c.r.opt.Progress != nil {
				c.r.opt.Progress("search", d, total)
			}
		})
	})
	if err != nil {
		return err
	}
	for _, p := range points {
		p.n = n
	}
	return nil
}

// chunk fills the words of blocks first to last-1 of all points, from the ledger
// where it has them.
func (c *curve) chunk(ctx context.Context, points []*Point, first, last, n int64, progress func(int64)) error {
	key := func(p *Point) string {
		return fmt.Sprintf("%s%s:%x:%d-%d/%d", pointMark, c.a.tag, math.Float64bits(p.Value), first, last, n)
	}
	var missing []*Point
	for _, p := range points {
		if words, ok := c.r.points[key(p)]; ok && int64(len(words)) == last-first {
			copy(p.words[first:last], words)
		} else {
			missing = append(missing, p)
		}
	}
	if len(missing) == 0 {
		return nil
	}
	models := make([]*rates.Model, len(missing))
	for i, p := range missing {
		models[i] = p.model
	}
	e, err := year.New(c.r.study.Base.Run.Seed, models...)
	if err != nil {
		return err
	}
	w := e.Worker()
	sink := &wordSink{points: missing}
	for b := first; b < last; b++ {
		if err := ctx.Err(); err != nil {
			return err
		}
		lanes := min(ensemble.Lanes, n-b*ensemble.Lanes)
		if err := w.Block(b*ensemble.Lanes, int(lanes), sink); err != nil {
			return err
		}
		progress(lanes * int64(len(missing)))
	}
	if c.r.ledger == nil {
		return nil
	}
	for _, p := range missing {
		if err := c.r.ledger.Append(key(p), appendWords(nil, p.words[first:last])); err != nil {
			return err
		}
	}
	return nil
}

// wordSink keeps only who fell. Workers write different words.
type wordSink struct{ points []*Point }

func (s *wordSink) Census(int, int, *ensemble.Row, uint64, uint64) {}

func (s *wordSink) Finish(variant int, end *ensemble.End) {
	s.points[variant].words[end.First/ensemble.Lanes] = end.Fallen
}

func appendWords(b []byte, words []uint64) []byte {
	for _, w := range words {
		b = binary.LittleEndian.AppendUint64(b, w)
	}
	return b
}

func readWords(b []byte) ([]uint64, error) {
	if len(b)%8 != 0 {
		return nil, errors.New("a record of the search is not of whole words")
	}
	out := make([]uint64, len(b)/8)
	for i := range out {
		out[i] = binary.LittleEndian.Uint64(b[8*i:])
	}
	return out, nil
}

// difference is the paired difference of two points' risks over the replicates
// that both have, p minus q.
func difference(p, q *Point, confidence float64) pva.Difference {
	n := min(p.n, q.n)
	var onlyP, onlyQ, both int64
	for i := int64(0); i*ensemble.Lanes < n; i++ {
		a, b := p.words[i], q.words[i]
		if left := n - i*ensemble.Lanes; left < ensemble.Lanes {
			mask := uint64(1)<<uint(left) - 1
			a, b = a&mask, b&mask
		}
		onlyP += int64(bits.OnesCount64(a &^ b))
		onlyQ += int64(bits.OnesCount64(b &^ a))
		both += int64(bits.OnesCount64(a & b))
	}
	return estimate.Paired(onlyP, onlyQ, both, n-onlyP-onlyQ-both, confidence)
}
