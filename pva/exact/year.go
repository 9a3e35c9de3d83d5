package exact

import (
	"context"
	"math"
	"strconv"
)

// year carries the state through one year, in the order of the model:
// catastrophes, harvest and stocking at the start, births and deaths, harvest
// and stocking at the end, the ceiling.
func (r *run) year(ctx context.Context, y int, b batch) batch {
	over := make([]float64, len(b))
	struck := r.strike(ctx, b)
	out := newBatch(len(b), r.top)
	for i, f := range r.factors {
		if struck[i] == nil {
			struck[i] = newBatch(len(b), r.top)
		}
		began := r.actions(ctx, y, "start", struck[i])
		if r.c.Births.Breeding == "flow" {
			r.outgrow(began)
		}
		r.live(ctx, y, f, out, began, over)
	}
	r.settle(out, over, r.lastAct(y))
	if r.always {
		r.look(out)
	}
	r.outgrow(out)
	out = r.actions(ctx, y, "end", out)
	r.outgrow(out)
	if r.c.Ceiling.Set {
		r.cutTo(out)
	}
	if r.always {
		r.look(out)
	}
	if r.between != nil {
		out = r.carry(out)
	}
	return out
}

// lastAct says that in year y nothing between births and the ceiling can see
// how far above the ceiling N is.
func (r *run) lastAct(y int) bool {
	if !r.c.Ceiling.Set || r.c.Births.Breeding == "flow" {
		return false // within a flow year N may come down again by itself
	}
	for j := range r.m.Takes {
		if t := &r.m.Takes[j]; t.Rule.When == "end" && t.Scheduled[y-1] {
			return false
		}
	}
	return r.top >= int(math.Min(r.c.Ceiling.Value, 1e15))
}

// strike splits the state by the product of births_times of the catastrophes
// that strike, in the order of the factors; those killed go first.
func (r *run) strike(ctx context.Context, b batch) []batch {
	classes := make([]batch, len(r.factors))
	classes[0] = b
	for i, k := range r.c.Catastrophe {
		chance := k.Prob()
		if chance == 0 {
			continue
		}
		next := make([]batch, len(classes))
		put := func(at int, w float64, v batch) {
			if next[at] == nil {
				next[at] = newBatch(len(b), r.top)
			}
			next[at].add(w, v)
		}
		for f, v := range classes {
			if v == nil {
				continue
			}
			hit := v
			if k.Kills > 0 {
				kill := r.act("kill"+strconv.Itoa(i), func() law { return killLaw(r.m.Kills[i], max(30, 2*r.order)) })
				hit = newBatch(len(b), r.top)
				kill.apply(ctx, hit, v, 1, make([]float64, len(b)))
				if r.always {
					hit.scale(chance) // so that what falls counts in proportion
					r.look(hit)
					hit.scale(1 / chance)
				}
			}
			if chance < 1 {
				put(f, 1-chance, v)
			}
			put(factorAt(r.factors, r.factors[f]*k.BirthsTimes), chance, hit)
		}
		classes = next
	}
	return classes
}

// act is the kernel of a rule, kept for the run.
func (r *run) act(key string, l func() law) *kernel {
	return r.acts.get(key, func(bool) *kernel { return newKernel(r.top, true, l()) })
}

// announceActs tells the store which kernels year y will ask for.
func (r *run) announceActs(y int) {
	for i, k := range r.c.Catastrophe {
		if k.Kills > 0 {
			r.acts.need("kill" + strconv.Itoa(i))
		}
	}
	for j := range r.m.Takes {
		if r.m.Takes[j].Scheduled[y-1] {
			r.acts.need(r.takeKey(j, y))
		}
	}
	for j, s := range r.c.Stocking {
		if s.Scheduled(r.c, y) {
			r.acts.need("stock" + strconv.Itoa(j))
		}
	}
}

// takeKey names the kernel of a take rule; only by_year differs between years.
func (r *run) takeKey(j, y int) string {
	t := &r.m.Takes[j]
	if t.Rule.Rule == "by_year" {
		return keyOf("take", j, " ", t.Target(y, 0))
	}
	return keyOf("take", j)
}

// actions applies the rules of one moment of year y, harvest first.
func (r *run) actions(ctx context.Context, y int, when string, b batch) batch {
	unseen := when == "end" && r.lastAct(y)
	step := func(k *kernel) {
		next, over := newBatch(len(b), r.top), make([]float64, len(b))
		k.apply(ctx, next, b, 1, over)
		r.settle(next, over, unseen)
		b = next
		if r.always {
			r.look(b)
		}
	}
	for j := range r.m.Takes {
		if t := &r.m.Takes[j]; t.Rule.When == when && t.Scheduled[y-1] {
			step(r.act(r.takeKey(j, y), func() law { return takeLaw(t, y, max(30, 2*r.order)) }))
		}
	}
	for j := range r.c.Stocking {
		if s := &r.c.Stocking[j]; s.When == when && s.Scheduled(r.c, y) && s.Add > 0 {
			step(r.act(keyOf("stock", j), func() law { return stockLaw(s) }))
		}
	}
	return b
}

// carry moves the weather a year on: along each axis of its grid in turn.
func (r *run) carry(b batch) batch {
	n := len(r.between)
	inner := len(r.grid) / n // points of the second axis, 1 if there is one axis
	out := newBatch(len(b), r.top)
	for i := 0; i < n; i++ {
		for k := 0; k < n; k++ {
			for j := 0; j < inner*perPoint; j++ {
				addTo(out[k*inner*perPoint+j], r.between[i][k], b[i*inner*perPoint+j])
			}
		}
	}
	if inner == 1 {
		return out
	}
	b, out = out, b
	for i := range out {
		clear(out[i])
	}
	for i := 0; i < n; i++ {
		for j := 0; j < inner; j++ {
			for k := 0; k < inner; k++ {
				for l := 0; l < perPoint; l++ {
					addTo(out[(i*inner+k)*perPoint+l], r.between[j][k], b[(i*inner+j)*perPoint+l])
				}
			}
		}
	}
	return out
}
