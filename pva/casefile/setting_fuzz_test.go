package casefile

import (
	"bytes"
	"flag"
	"fmt"
	"math/rand/v2"
	"strings"
	"testing"
	"time"

	"ebbline/pva"
)

var long = flag.Bool("long", false, "push ten million mutated inputs through, or as many as an hour allows")

// mutations calls try on n mutated copies of the seeds, fewer if an hour does not
// do, and says how many there were. The same n gives the same inputs.
func mutations(t *testing.T, n int, words []string, seeds [][]byte, try func(data []byte)) {
	t.Helper()
	if *long {
		n = 10_000_000
	}
	g, began, i := rand.New(rand.NewPCG(1, uint64(len(seeds)))), time.Now(), 0
	for ; i < n && !t.Failed() && (i%1000 > 0 || time.Since(began) < time.Hour); i++ {
		data := bytes.Clone(seeds[g.IntN(len(seeds))])
		for range 1 + g.IntN(3) {
			at := g.IntN(len(data) + 1)
			end := min(len(data), at+1+g.IntN(12))
			switch g.IntN(6) {
			case 0: // one byte is another
				if at < len(data) {
					data[at] ^= byte(1 << g.IntN(8))
				}
			case 1: // a stretch is gone
				data = append(data[:at:at], data[end:]...)
			case 2: // or there twice
				data = append(data[:end:end], data[at:]...)
			case 3: // a word of the language stands in the way
				data = append(append(data[:at:at], words[g.IntN(len(words))]...), data[at:]...)
			case 4: // or in place of something
				data = append(append(data[:at:at], words[g.IntN(len(words))]...), data[end:]...)
			default: // a part of another seed
				other := seeds[g.IntN(len(seeds))]
				from := g.IntN(len(other) + 1)
				data = append(append(data[:at:at], other[from:min(len(other), from+g.IntN(60))]...), data[at:]...)
			}
		}
		try(data)
	}
	t.Logf("%d mutated inputs in %v", i, time.Since(began).Round(time.Second))
}

// TestMutatedCases: what FuzzRead holds, for inputs that are the same each time:
// a case or faults, and a case that is written and read again is the same.
func TestMutatedCases(t *testing.T) {
	var seeds [][]byte
	for _, name := range sortedKeys(goodCases(t)) {
		seeds = append(seeds, goodCases(t)[name])
	}
	seeds = append(seeds, []byte(smallCase), []byte(withControl))
	words := []string{"[", "]", "{", "}", "[[", "\n", "=", ",", "\"", "'", ".", "#", "-", "1e", "0x", "inf", "nan", "true", "_", "\x00", "\ufeff", "value", "source", "births", "harvest", "rate", "take", "[[sweep]]\n", "[[option]]\n", "set = {", "1e12", "-1", "0", "1e-31"}
	read, kept := 0, 0
	mutations(t, 10_000, words, seeds, func(data []byte) {
		c, errs := Read("m.toml", data)
		read++
		if (c == nil) != (len(errs) > 0) {
			t.Fatalf("a case %v and %d errors for %q", c != nil, len(errs), data)
		}
		if c == nil {
			if strings.ContainsAny(errs.Text(true), "\x00\x1b\a\b") {
				t.Errorf("control characters in what is said of %q", data)
			}
			return
		}
		kept++
		text := Write(c)
		if again, errs := Read("again.toml", text); len(errs) > 0 || again.Digest() != c.Digest() {
			t.Fatalf("written and read again it is another: %v\n%q\n%s", errs, data, text)
		}
	})
	if kept < read/100 || kept > read*9/10 {
		t.Errorf("%d of %d are cases: the mutations are not what they should be", kept, read)
	}
}

func sortedKeys(m map[string][]byte) []string {
	var out []string
	for k := range m {
		out = append(out, k)
	}
	for i := range out {
		for j := i + 1; j < len(out); j++ {
			if out[j] < out[i] {
				out[i], out[j] = out[j], out[i]
			}
		}
	}
	return out
}

// override holds what an override may do: fault in a line that names --set, or
// set what it says and leave every other entry as it was. Entries may go, as
// the rival of a key does; none may change or come.
func override(t *testing.T, base *pva.Case, text string) (changed bool) {
	t.Helper()
	settings, err := ParseSetting(text)
	if err != nil {
		if !strings.HasPrefix(err.Error(), "--set ") || strings.ContainsAny(err.Error(), "\n\x00\x1b") {
			t.Errorf("%q is refused with %q", text, err)
		}
		return false
	}
	if len(settings) == 0 {
		t.Errorf("%q sets nothing and is no fault", text)
	}
	c, errs := Override(base, settings)
	if len(errs) > 0 {
		for _, e := range errs {
			if e.File != "--set" || e.Fault.Key == "" {
				t.Errorf("%q: a fault without its place or key: %v", text, e)
			}
		}
		return false
	}
	was, is, set := map[string]pva.Value{}, map[string]pva.Value{}, map[string]pva.Value{}
	for _, e := range base.Entries() {
		was[e.Path] = e.Value
	}
	for _, s := range settings {
		at := s.Path
		if path, fault := base.Lookup(s.Path); fault == nil {
			at = path
		}
		set[at] = s.Value
	}
	for _, e := range c.Entries() {
		is[e.Path] = e.Value
		want, fresh := set[e.Path]
		if !fresh {
			old, there := was[e.Path]
			if !there {
				t.Errorf("%q: %s has come", text, e.Path)
			}
			want = old
		}
		if want.String() != e.Value.String() {
			t.Errorf("%q: %s is %s, want %s", text, e.Path, e.Value.String(), want.String())
		}
	}
	for path, v := range set {
		if _, there := is[path]; !there && v.Kind != pva.ListKind {
			t.Errorf("%q: %s is not set", text, path)
		}
	}
	if again, errs := Read("again.toml", Write(c)); len(errs) > 0 || again.Digest() != c.Digest() {
		t.Errorf("%q: written and read again it is another: %v", text, errs)
	}
	return true
}

var overrides = []string{"harvest.control.take=4", "births.by_year=[1,0.9]", "births.crowding={form='linear',capacity=900}", "births.rate=0.44", "deaths.rate=0.2", "question.horizon=20", "run.seed=18446744073709551615",
	"births.breeding=flow", "births.steps=[{from=2,factor=0.5}]", "harvest.1.years=3-9", "case.title=a = b", "run.baseline=false", "start.year=2030", "option.half.set={}", "harvest.1.points=[[1,2],[3,4]]", "births.rate={value=1}", "catastrophe.1.chance=0.1"}

// FuzzOverride: an override faults, or sets what it says and nothing else.
func FuzzOverride(f *testing.F) {
	for _, s := range overrides {
		f.Add(s)
	}
	base := mustRead(f, "base", []byte(withControl))
	f.Fuzz(func(t *testing.T, text string) { override(t, base, text) })
}

// TestMutatedOverrides is the same for inputs that are the same each time.
func TestMutatedOverrides(t *testing.T) {
	var seeds [][]byte
	for _, s := range overrides {
		seeds = append(seeds, []byte(s))
	}
	for _, k := range pva.Keys() {
		seeds = append(seeds, []byte(strings.ReplaceAll(k.Path, "*", "1")+"="+fmt.Sprint(1)))
	}
	base := mustRead(t, "base", []byte(withControl))
	n := 0
	mutations(t, 20_000, []string{"=", "[", "]", "{", "}", ",", "'", "\"", ".", "1", "-", "e", "_", " ", "\n", "control", "births", "harvest", "rate", "0.5", "value", "false"}, seeds, func(data []byte) {
		if override(t, base, string(data)) {
			n++
		}
	})
	if n < 200 {
		t.Errorf("only %d overrides changed anything: the mutations are not what they should be", n)
	}
}
