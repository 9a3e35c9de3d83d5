package assess

import (
	"context"
	"errors"
	"flag"
	"runtime"
	"testing"
	"time"

	"ebbline/pva"
	"ebbline/pva/casefile"
)

var soak = flag.Duration("soak", 0, "assess random cases for so long and watch the memory")

// TestSoak assesses one random case after another, each written, read again and
// assessed with everything beside it: the memory in use after each collection
// stays flat. It runs for two seconds; give -soak 1h for more.
func TestSoak(t *testing.T) {
	span := 2 * time.Second
	if *soak > 0 {
		span = *soak
	}
	heap := func() uint64 {
		var m runtime.MemStats
		runtime.GC()
		runtime.GC()
		runtime.ReadMemStats(&m)
		return m.HeapAlloc
	}
	ended := time.Now().Add(span)
	var first, largest uint64
	looks, cases, stopped := 0, 0, 0
	// Tables and the laws remembered are made in the first cases: the yardstick
	// is the memory after as many cases as fill what is remembered.
	const warm, every = 100, 50
	for time.Now().Before(ended) || looks < 3 {
		c := randomCases.Example(cases)
		cases++
		again, errs := casefile.Read("soak.toml", casefile.Write(c))
		if len(errs) > 0 || again.Digest() != c.Digest() {
			t.Fatalf("case %d: written and read: %v", cases, errs)
		}
		again, faults := again.With([]pva.Setting{{Path: "run.replicates", Value: pva.Num(256)}})
		if len(faults) > 0 {
			t.Fatalf("case %d: %v", cases, faults)
		}
		// Every third case is stopped in the middle.
		ctx, cancel := context.WithCancel(context.Background())
		opt := Options{Workers: 2, Exact: ExactNever}
		if cases%3 == 0 {
			opt.Progress = func(done int64) { cancel() }
		}
		a, err := Run(ctx, again, opt)
		cancel()
		switch {
		case errors.Is(err, context.Canceled):
			stopped++
		case err != nil:
			t.Fatalf("case %d: %v\n%s", cases, err, entryLines(c))
		}
		if err == nil && (a == nil || a.Replicates != 256) {
			t.Fatalf("case %d: %+v", cases, a)
		}
		if cases < warm || cases%every != 0 {
			continue
		}
		now := heap()
		if first == 0 {
			first = now
		}
		largest = max(largest, now)
		looks++
		// Flat: a leak of one row of a tally a case (1 kB) shows within 8,000 cases.
		if now > first+8<<20 {
			t.Fatalf("after %d cases %.1f MB are in use, %.1f after the first %d", cases, float64(now)/1e6, float64(first)/1e6, warm)
		}
	}
	t.Logf("%d cases, %d of them stopped in the middle, in %v; %.2f MB in use at first, %.2f at most, over %d looks; %d goroutines", cases, stopped, span, float64(first)/1e6, float64(largest)/1e6, looks, runtime.NumGoroutine())
	if n := runtime.NumGoroutine(); n > 20 {
		t.Errorf("%d goroutines are left", n)
	}
}
