package pva

import (
	"math"
	"regexp"
	"strings"
	"testing"
)

// positioned is a key's path with each position 1.
func positioned(k *Key) string { return strings.ReplaceAll(k.Path, "*", "1") }

// bound matches a fault that names a number, not another key.
var bound = regexp.MustCompile(`^is (not )?(below|above) -?[0-9.e]+$`)

// TestRangesAreKept puts values just outside and at the ends of its range under
// each number key of the table: outside is a fault of that very key that says
// which bound is broken; an allowed end is none.
func TestRangesAreKept(t *testing.T) {
	checked := 0
	for _, k := range Keys() {
		if !k.IsNumber() {
			continue
		}
		path := positioned(k)
		for _, x := range []struct {
			v    float64
			want string // "" if allowed
		}{
			{math.Nextafter(k.Min, math.Inf(-1)), "is below "},
			{math.Nextafter(k.Max, math.Inf(1)), "is above "},
			{k.Min, map[bool]string{true: "is not above "}[k.OpenMin]},
			{k.Max, map[bool]string{true: "is not below "}[k.OpenMax]},
		} {
			if x.v == k.Max && k.Path == "run.seed" {
				continue // 2^64 itself is one beyond the largest seed
			}
			checked++
			got := ""
			_, faults := Build([]Entry{{Path: path, Value: Num(x.v)}})
			for _, f := range faults {
				if f.Path == path && bound.MatchString(f.Want) {
					got = f.Want
				}
			}
			if (x.want == "") != (got == "") || !strings.HasPrefix(got, x.want) {
				t.Errorf("%s = %v gives %q, want %q", path, x.v, got, x.want)
			}
		}
	}
	if checked < 200 {
		t.Errorf("only %d bounds checked", checked)
	}
}

// TestWholeNumbers: keys that count take no halves, all others do.
func TestWholeNumbers(t *testing.T) {
	for _, k := range Keys() {
		if !k.IsNumber() {
			continue
		}
		half := math.Ceil(max(k.Min, 0)) + 0.5
		if half > k.Max {
			continue
		}
		_, faults := Build([]Entry{{Path: positioned(k), Value: Num(half)}})
		whole := false
		for _, f := range faults {
			whole = whole || f.Path == positioned(k) && f.Want == "is not a whole number"
		}
		if whole != k.Whole {
			t.Errorf("%s = %v is refused for its half: %v", k.Path, half, whole)
		}
	}
}

// TestEachKeyRefusesOtherKinds: a number key refuses a text and a flag, a flag
// a text, and no key is taken silently.
func TestEachKeyRefusesOtherKinds(t *testing.T) {
	for _, k := range Keys() {
		path := positioned(k)
		for _, v := range []Value{Text("nonsense nobody means"), Flag(true), Num(0.123), {Kind: ListKind}} {
			fits := false
			switch k.At(new(Case), 0, 0, 0).(type) {
			case *string:
				fits = v.Kind == TextKind && len(k.Choices) == 0
				if k.Path == "run.substeps" || strings.HasSuffix(k.Path, ".key") || strings.HasSuffix(k.Path, ".keys.*") {
					continue // their texts mean something, and are tested by what they mean
				}
			case *bool:
				fits = v.Kind == FlagKind
			case *Years:
			default:
				fits = v.Kind == NumberKind
				if fits {
					continue // ranges have a test of their own
				}
			}
			_, faults := Build([]Entry{{Path: path, Value: v}})
			faulted := false
			for _, f := range faults {
				faulted = faulted || f.Path == path && !f.Missing && !f.OfKey
			}
			if faulted == fits {
				t.Errorf("%s = %v: faulted %v", path, v, faulted)
			}
		}
	}
}

// TestDefaultsAreAllowed: what stands in for a key that is not given is itself
// in range.
func TestDefaultsAreAllowed(t *testing.T) {
	for _, k := range Keys() {
		if v, ok := k.Default.(float64); ok && k.offends(v) != "" && !strings.HasSuffix(k.Path, "cycle.period") {
			t.Errorf("%s: the default %v %s", k.Path, v, k.offends(v))
		}
		if k.Required && k.Default != nil {
			t.Errorf("%s is required and has a default", k.Path)
		}
		if k.Doc == "" || strings.HasPrefix(k.Asks(), ":") {
			t.Errorf("%s says nothing about itself: %q", k.Path, k.Asks())
		}
		if k.WhenPath != "" {
			if sibling, _ := Find(positioned(&Key{Path: k.WhenPath})); sibling == nil || len(sibling.Choices) == 0 {
				t.Errorf("%s depends on %s, which is no word of a case", k.Path, k.WhenPath)
			}
		}
	}
}

// TestTiniest: a number too small to have digits is refused; 0 is not.
func TestTiniest(t *testing.T) {
	k, _ := Find("births.rate")
	for v, want := range map[float64]string{0: "", 1e-30: "", 5e-324: "is nearer to 0 than 1e-30", 9e-31: "is nearer to 0 than 1e-30"} {
		if got := k.offends(v); got != want {
			t.Errorf("%v %s, want %q", v, got, want)
		}
	}
}
