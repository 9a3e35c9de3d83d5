package pva

import (
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
)

func TestResolve(t *testing.T) {
	out, from, faults := Resolve(entries(`
harvest.eggs.take = 1
harvest.1.name = "control"
harvest.control.take = 2
harvest.eggs.when = "end"
births.rate = 1
harvest.eggs.name = "eggs"`))
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	var got []string
	for i, e := range out {
		got = append(got, e.Path+" "+e.Value.String()+" "+string(rune('0'+from[i])))
	}
	want := []string{"harvest.2.name eggs 0", "harvest.2.take 1 0", "harvest.1.name control 1", "harvest.1.take 2 2", "harvest.2.when end 3", "births.rate 1 4"}
	if !slices.Equal(got, want) {
		t.Errorf("got  %q\nwant %q", got, want)
	}
}

func TestResolveFaults(t *testing.T) {
	for _, x := range []struct{ lines, want string }{
		{"harvest.1.name = \"a\"\nharvest.2.name = \"a\"", `harvest.2.name: "a" names two rows of [[harvest]]; give each its own name`},
		{`harvest.1.name = "a.b"`, `harvest.1.name: "a.b" cannot be a name: it has a dot, which parts the words of a key; give a short name in plain words`},
		{`harvest.1.name = "12"`, `harvest.1.name: "12" cannot be a name: a bare number is the position of a row; give a short name in plain words`},
		{`sweep.first.key = "births.rate"`, `sweep.first.key: has no position; rows of [[sweep]] have no names: write sweep.1`},
	} {
		_, _, faults := Resolve(entries(x.lines))
		if faults.Error() != x.want {
			t.Errorf("%q gives %v\nwant %s", x.lines, faults, x.want)
		}
	}
}

// TestLookupAndDisplay are each other's inverse for named rows.
func TestLookupAndDisplay(t *testing.T) {
	c := heronCase(t)
	for _, e := range c.Entries() {
		shown := c.Display(e.Path)
		if IsArrayTable(topOf(e.Path)) == (shown == e.Path) {
			t.Errorf("%s is shown as %s", e.Path, shown)
		}
		if at, fault := c.Lookup(shown); fault != nil || at != e.Path {
			t.Errorf("%s is found at %q, %v; want %s", shown, at, fault, e.Path)
		}
	}
}

// TestOrderDoesNotMatter: entries in any order make the same case and digest.
func TestOrderDoesNotMatter(t *testing.T) {
	all := append(entries(herons), entries(`
option.1.name = "a"
option.1.set.births.by_year = (list)
option.1.set.births.by_year.1 = 1
option.1.set.births.by_year.2 = 2
option.1.set.births.rate = 0.4
option.1.set.deaths.by_year = (list)
option.1.set.deaths.by_year.1 = 1
option.1.set.harvest.control.take = 1
option.2.name = "b"
option.2.set.births.rate = 0.3`)...)
	want, faults := Build(all)
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	r := rand.New(rand.NewPCG(1, 2))
	for range 200 {
		r.Shuffle(len(all), func(i, j int) { all[i], all[j] = all[j], all[i] })
		got, faults := Build(all)
		if len(faults) > 0 {
			t.Fatal(faults)
		}
		if got.Digest() != want.Digest() {
			t.Fatalf("another digest from the order %q", paths(got))
		}
	}
}

// TestPathOrder is a strict order: no three paths go round in a circle.
func TestPathOrder(t *testing.T) {
	all := []string{"a", "a.1", "a.2", "a.10", "a.b", "a.b.2", "a.b.10.c", "a.1a", "a.9", "b.1", "a.10.b", "a.2.x"}
	for _, x := range all {
		for _, y := range all {
			if (x != y) != (pathLess(x, y) != pathLess(y, x)) || pathLess(x, x) {
				t.Errorf("%s and %s are not in one order", x, y)
			}
			for _, z := range all {
				if pathLess(x, y) && pathLess(y, z) && !pathLess(x, z) {
					t.Errorf("%s, %s, %s go round", x, y, z)
				}
			}
		}
	}
	if !pathLess("a.2", "a.10") || !pathLess("a", "a.1") || !pathLess("a.9", "a.b") {
		t.Error("positions do not count as numbers, before words")
	}
}

// TestDigest changes with every value, source and note, but not with the seed,
// the number of replicates, or how a number is written.
func TestDigest(t *testing.T) {
	base := heronCase(t)
	build := func(change func([]Entry)) string {
		all := entries(herons)
		change(all)
		c, faults := Build(all)
		if len(faults) > 0 {
			t.Fatal(faults)
		}
		return c.Digest()
	}
	for _, x := range []struct {
		same   bool
		change func([]Entry)
	}{
		{true, func([]Entry) {}},
		{false, func(e []Entry) { e[4].Value = Num(0.51) }},
		{false, func(e []Entry) { e[4].Source = "another" }},
		{false, func(e []Entry) { e[4].Note = "a note" }},
		{true, func(e []Entry) { e[4].Value.Text = "5e-1" }},
	} {
		if got := build(x.change) == base.Digest(); got != x.same {
			t.Errorf("the digest is the same: %v, want %v", got, x.same)
		}
	}
	for _, line := range []string{"run.seed = 5", "run.replicates = 7"} {
		c, faults := Build(append(entries(herons), entries(line)...))
		if len(faults) > 0 || c.Digest() != base.Digest() {
			t.Errorf("%s changes the digest (%v)", line, faults)
		}
	}
}

func TestNearest(t *testing.T) {
	for _, x := range []struct{ name, want string }{
		{"poisson", "poisson"}, {"poison", "poisson"}, {"clumpd", "clumped"}, {"at-most-on", "at-most-one"},
		{"binomial", ""}, {"", ""}, {"x", ""}, {strings.Repeat("poisson", 20), ""},
	} {
		if got := Nearest(x.name, []string{"poisson", "at-most-one", "clumped"}); got != x.want {
			t.Errorf("nearest to %q is %q, want %q", x.name, got, x.want)
		}
	}
}
