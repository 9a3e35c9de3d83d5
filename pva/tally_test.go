package pva

import (
	"math/rand/v2"
	"reflect"
	"testing"
)

// filled gives every number, sum and histogram of a tally a random content, by
// its type, so that a field added later is filled too.
func filled(r *rand.Rand, horizon int) *Tally {
	t := NewTally(horizon)
	fill(r, reflect.ValueOf(t).Elem())
	return t
}

func fill(r *rand.Rand, v reflect.Value) {
	switch at := v.Addr().Interface().(type) {
	case *Histogram:
		for range 1 + r.IntN(20) {
			at.Add(r.Int64() >> (40 + r.IntN(23)))
		}
		return
	case *Sum:
		for range 1 + r.IntN(5) {
			at.Add(int64(r.Uint64()) >> r.IntN(10))
		}
		return
	case *int64:
		*at = 1 + r.Int64N(1e9)
		return
	}
	switch v.Kind() {
	case reflect.Struct:
		for i := range v.NumField() {
			fill(r, v.Field(i))
		}
	case reflect.Slice, reflect.Array:
		for i := range v.Len() {
			fill(r, v.Index(i))
		}
	default:
		panic("a tally holds a " + v.Type().String() + ", which this test cannot fill")
	}
}

// merged is a new tally with the given ones added in order.
func merged(horizon int, parts ...*Tally) *Tally {
	t := NewTally(horizon)
	for _, p := range parts {
		t.Merge(p)
	}
	return t
}

// Merging into an empty tally gives the tally: no field is left out.
func TestMergeKeepsEveryField(t *testing.T) {
	r := rand.New(rand.NewPCG(7, 7))
	one := filled(r, 3)
	if got := merged(3, one); !reflect.DeepEqual(got, one) {
		t.Errorf("merged into nothing:\n%+v, want\n%+v", got, one)
	}
}

// Merging has no order and no grouping.
func TestMergeHasNoOrder(t *testing.T) {
	for seed := range uint64(20) {
		r := rand.New(rand.NewPCG(seed, 8))
		a, b, c := filled(r, 4), filled(r, 4), filled(r, 4)
		want := merged(4, a, b, c)
		for _, got := range []*Tally{
			merged(4, c, b, a), merged(4, b, a, c), merged(4, merged(4, a, b), c), merged(4, a, merged(4, b, c)),
		} {
			if !reflect.DeepEqual(got, want) {
				t.Fatalf("seed %d: the order of merging shows", seed)
			}
		}
	}
}

// Merging reads the other tally and does not keep hold of it.
func TestMergeLeavesTheOtherAlone(t *testing.T) {
	r := rand.New(rand.NewPCG(9, 9))
	a, b := filled(r, 2), filled(r, 2)
	before := merged(2, b)
	merged(2, b).Merge(a)
	if !reflect.DeepEqual(b, before) {
		t.Error("the merged tally changed")
	}
}
