package exact

import (
	"context"
	"fmt"
	"sync"

	"gonum.org/v1/gonum/floats"
)

// yearMap is births and deaths of one year: it moves every law of src, adds
// the result times w to dst, and what went beyond top to over.
type yearMap interface {
	apply(ctx context.Context, dst, src batch, w float64, over []float64)
}

// chain is two kernels, one after the other.
type chain struct{ first, second *kernel }

func (c chain) apply(ctx context.Context, dst, src batch, w float64, over []float64) {
	mid := newBatch(len(src), c.first.top)
	c.first.apply(ctx, mid, src, 1, over)
	c.second.apply(ctx, dst, mid, w, over)
}

// average is a weighted sum of maps.
type average struct {
	weights []float64
	maps    []yearMap
}

func (a average) apply(ctx context.Context, dst, src batch, w float64, over []float64) {
	for i, m := range a.maps {
		m.apply(ctx, dst, src, w*a.weights[i], over)
	}
}

// flowPart is a flow year under one weather. Its movers are made when first needed.
type flowPart struct {
	weight         float64
	always         bool // the threshold is watched always
	bound          float64
	uses           int // about how many laws it will move
	generator      func(watched bool) birthDeath
	free, watching mover
}

// flowAverage is a flow year averaged over the weather, its points shared out
// between two goroutines by parity.
type flowAverage struct{ parts []*flowPart }

func (f flowAverage) apply(ctx context.Context, dst, src batch, w float64, over []float64) {
	second := newBatch(len(dst), len(dst[0])-1)
	overs := [2][]float64{make([]float64, len(dst)), make([]float64, len(dst))}
	var wait sync.WaitGroup
	half := func(start int, out batch, over []float64) {
		defer wait.Done()
		for i := start; i < len(f.parts) && ctx.Err() == nil; i += 2 {
			f.parts[i].apply(ctx, out, src, w*f.parts[i].weight, over)
		}
	}
	wait.Add(2)
	go half(0, dst, overs[0])
	half(1, second, overs[1])
	wait.Wait()
	dst.add(1, second)
	for i := range over {
		over[i] += overs[0][i] + overs[1][i]
	}
}

// apply moves each law by the generator; with the threshold watched always,
// every law but the first of each three stops at it.
func (p *flowPart) apply(_ context.Context, dst, src batch, w float64, over []float64) {
	var free, watching []int
	for i := range src {
		if from, to := src[i : i+1].support(); to < from {
			continue
		}
		if p.always && i%perPoint != 0 {
			watching = append(watching, i)
		} else {
			free = append(free, i)
		}
	}
	move := func(by *mover, which []int, watched bool) {
		if len(which) == 0 {
			return
		}
		if *by == nil {
			*by = p.generator(watched).mover(p.bound, p.uses)
		}
		top := len(src[0]) - 1
		vs := newBatch(len(which), top+1)
		for k, i := range which {
			copy(vs[k], src[i])
		}
		(*by).move(vs)
		for k, i := range which {
			floats.AddScaled(dst[i], w, vs[k][:top+1])
			over[i] += w * vs[k][top+1]
		}
	}
	move(&p.free, free, false)
	move(&p.watching, watching, true)
}

// store keeps what is built for a year as long as a later year needs the same.
type store[T any] struct {
	left map[string]int
	have map[string]T
}

func newStore[T any]() *store[T] {
	return &store[T]{map[string]int{}, map[string]T{}}
}

// need announces one later use of a key.
func (s *store[T]) need(key string) { s.left[key]++ }

// get is the thing of a key, made if it is not there; make is told whether
// it will be used again.
func (s *store[T]) get(key string, build func(again bool) T) T {
	s.left[key]--
	again := s.left[key] > 0
	v, ok := s.have[key]
	if !ok {
		v = build(again)
	}
	if again {
		s.have[key] = v
	} else {
		delete(s.have, key)
	}
	return v
}

func keyOf(values ...any) string { return fmt.Sprint(values...) }
