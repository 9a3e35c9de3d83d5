package pva

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// checkLater checks what uncertain inputs, sweeps and the minimum size refer to.
func (b *builder) checkLater() {
	seen := map[string]bool{} // by position
	for i := range b.c.Uncertain {
		b.checkUncertain(i, seen)
	}
	pairs := map[[2]string]bool{}
	for i := range b.c.UncertainPair {
		b.checkPair(i, seen, pairs)
	}
	swept := map[string]bool{}
	cells := 1.0
	for i := range b.c.Sweep {
		cells *= b.checkSweep(i, swept)
	}
	if cells > mostCells {
		b.fault("sweep.1.key", "", fmt.Sprintf("the grid has %.0f cells", cells), fmt.Sprintf("a sweep has at most %d", mostCells))
	}
	if m := b.c.Minimum; m.From.Set && m.To.Set && m.From.Value >= m.To.Value {
		b.fault("minimum.to", b.value("minimum.to"), "is not above minimum.from", "give the smallest size under from and the largest under to")
	}
}

// The largest grids: more would be a slip of the step.
const (
	mostSwept = 10_000
	mostCells = 1_000_000
)

func (b *builder) checkUncertain(i int, seen map[string]bool) {
	row := "uncertain." + strconv.Itoa(i+1) + "."
	u := b.c.Uncertain[i]
	k, at := b.refer(row+"key", u.Key)
	if k != nil {
		if seen[at] {
			b.fault(row+"key", strconv.Quote(u.Key), "is uncertain twice", "keep one law")
		}
		seen[at] = true
		switch top := topOf(at); {
		case k.Whole || top == "question" || top == "run" || top == "minimum" || top == "sweep" || top == "uncertain" || top == "uncertain_pair" || top == "yardsticks":
			b.fault(row+"key", strconv.Quote(u.Key), "cannot be uncertain", "name a number that says something about the population or the take")
			return
		}
	}
	bounds := u.Low.Set && u.High.Set
	if u.Law != "" && !u.SD.Set && !bounds && !b.bad[row+"sd"] && !b.bad[row+"low"] && !b.bad[row+"high"] {
		switch {
		case u.Low.Set:
			b.missing(row+"high", "give low and high, or sd")
		case u.High.Set:
			b.missing(row+"low", "give low and high, or sd")
		default:
			b.missing(row+"sd", "give sd, or low and high")
		}
	}
	for _, key := range []string{"low", "high", "mode"} {
		if u.SD.Set && b.has(row+key) {
			b.ofKey(row+key, b.value(row+key), "is given beside sd", "give either sd or low and high")
			return
		}
	}
	if bounds && u.Low.Value >= u.High.Value {
		b.fault(row+"high", b.value(row+"high"), "is not above low", "give a low that is below high")
	}
	if u.Mode.Set && bounds && (u.Mode.Value < u.Low.Value || u.Mode.Value > u.High.Value) {
		b.fault(row+"mode", b.value(row+"mode"), "is not between low and high", "the likeliest value lies between them")
	}
	if k != nil {
		b.checkLaw(row, u, k, at)
	}
}

// checkLaw checks a law against the key and the value that it is a law of.
func (b *builder) checkLaw(row string, u Uncertain, k *Key, at string) {
	for _, bound := range []struct {
		name string
		v    Optional
	}{{"low", u.Low}, {"high", u.High}} {
		if want := k.offends(bound.v.Value); bound.v.Set && want != "" && !closedEnd(k, bound.v.Value) {
			b.fault(row+bound.name, b.value(row+bound.name), want, u.Key+" is "+k.Range())
		}
	}
	_, pos := Find(at)
	mean, set := numberOf(k.At(b.c, pos...))
	if !set {
		b.fault(row+"key", strconv.Quote(u.Key), "has no value in this case", "give "+u.Key+" a value for the law to lie around")
		return
	}
	if !u.SD.Set {
		return
	}
	switch {
	case u.Law == "lognormal" && mean <= 0:
		b.fault(row+"law", `"lognormal"`, "needs a value above 0", fmt.Sprintf("%s is %v: choose another law", u.Key, mean))
	case u.Law == "beta" && (mean <= 0 || mean >= 1):
		b.fault(row+"law", `"beta"`, "needs a value between 0 and 1", fmt.Sprintf("%s is %v: choose another law, or give low and high", u.Key, mean))
	case u.Law == "beta":
		b.spread(row+"sd", Optional{mean, true}, u.SD.Value)
	}
}

// closedEnd says whether v is an end of the key's range that is itself not
// allowed: a law may reach up to it.
func closedEnd(k *Key, v float64) bool {
	return k.OpenMin && v == k.Min || k.OpenMax && v == k.Max
}

// numberOf reads a field that Key.At points to.
func numberOf(p any) (v float64, set bool) {
	switch p := p.(type) {
	case *float64:
		return *p, true
	case *Optional:
		return p.Value, p.Set
	case *int:
		return float64(*p), true
	case *int64:
		return float64(*p), true
	case *uint64:
		return float64(*p), true
	}
	return 0, false
}

func (b *builder) checkPair(i int, seen map[string]bool, pairs map[[2]string]bool) {
	row := "uncertain_pair." + strconv.Itoa(i+1) + "."
	p := b.c.UncertainPair[i]
	var at [2]string
	for j := 0; j < len(p.Keys) && j < 2; j++ {
		at[j] = p.Keys[j]
		if found, fault := b.c.Lookup(p.Keys[j]); fault == nil {
			at[j] = found
		}
	}
	if len(p.Keys) != 2 || at[0] == at[1] {
		if b.under[row+"keys"] {
			b.fault(row+"keys", strings.Join(p.Keys, ", "), "is not a list of two different keys", `write keys = ["births.rate", "deaths.fraction"]`)
		} else {
			b.missing(row+"keys", `write keys = ["births.rate", "deaths.fraction"]`)
		}
		return
	}
	for j, key := range p.Keys {
		if !seen[at[j]] {
			b.fault(row+"keys."+strconv.Itoa(j+1), strconv.Quote(key), "is not marked uncertain", "add an [[uncertain]] table for it")
		}
	}
	if at[0] > at[1] {
		at[0], at[1] = at[1], at[0]
	}
	if pairs[at] {
		b.fault(row+"keys", strings.Join(p.Keys, ", "), "is a pair given twice", "keep one of them")
	}
	pairs[at] = true
}

// checkSweep checks one dimension and returns its number of values.
func (b *builder) checkSweep(i int, swept map[string]bool) (values float64) {
	row := "sweep." + strconv.Itoa(i+1) + "."
	s := b.c.Sweep[i]
	k, at := b.refer(row+"key", s.Key)
	if k != nil {
		if swept[at] {
			b.fault(row+"key", strconv.Quote(s.Key), "is swept twice", "keep one of them")
		}
		swept[at] = true
		if top := topOf(at); top == "sweep" || top == "uncertain" || top == "uncertain_pair" || top == "minimum" {
			b.fault(row+"key", strconv.Quote(s.Key), "cannot be swept", "name a number of the question, the population or the take")
			k = nil
		}
	}
	for _, key := range []string{"from", "to", "step"} {
		if b.under[row+"values"] && b.has(row+key) {
			b.ofKey(row+key, b.value(row+key), "is given beside values", "give either values or from, to and step")
			return 1
		}
		if !b.under[row+"values"] && !b.has(row+key) {
			if !b.has(row+"from") && !b.has(row+"to") && !b.has(row+"step") {
				b.missing(row+"values", "give values = [ ... ], or from, to and step")
				return 1
			}
			b.missing(row+key, "from, to and step go together")
		}
	}
	if len(s.Values) > 0 {
		for j, v := range s.Values {
			b.sweptValue(row+"values."+strconv.Itoa(j+1), s.Key, k, v)
		}
		return float64(len(s.Values))
	}
	if !s.From.Set || !s.To.Set || !s.Step.Set {
		return 1
	}
	if s.To.Value < s.From.Value {
		b.fault(row+"to", b.value(row+"to"), "is below from", "give the smallest value under from and the largest under to")
		return 1
	}
	n := math.Floor((s.To.Value-s.From.Value)/s.Step.Value+1e-9) + 1
	if n > mostSwept {
		b.fault(row+"step", b.value(row+"step"), fmt.Sprintf("makes %.0f values", n), fmt.Sprintf("give a larger step: %d values are the most", mostSwept))
		return 1
	}
	b.sweptValue(row+"from", s.Key, k, s.From.Value)
	b.sweptValue(row+"to", s.Key, k, s.From.Value+float64((n-1)*s.Step.Value))
	if k != nil && k.Whole && s.Step.Value != math.Trunc(s.Step.Value) {
		b.fault(row+"step", b.value(row+"step"), "is not a whole number", s.Key+" is "+k.Range())
	}
	return n
}

func (b *builder) sweptValue(path, key string, k *Key, v float64) {
	if k == nil || b.bad[path] {
		return
	}
	if want := k.offends(v); want != "" {
		b.fault(path, plainNumber(v), want, key+" is "+k.Range())
	}
}

// refer faults a reference to a key that is no number of this case; otherwise
// it is the key and its path by position.
func (b *builder) refer(path, key string) (*Key, string) {
	if key == "" {
		return nil, ""
	}
	at, fault := b.c.Lookup(key)
	if fault != nil {
		b.fault(path, quoted(Text(key)), "names nothing: "+fault.Want, fault.Fix)
		return nil, ""
	}
	k, _ := Find(at)
	switch {
	case k == nil:
		f := Fault{}
		if b.hints++; b.hints <= mostHints {
			f = UnknownKey(at)
			if f.Meant != "" {
				f.Fix = strings.Replace(f.Fix, f.Meant, b.c.Display(f.Meant), 1)
			}
		}
		b.fault(path, quoted(Text(key)), "is not a key of a case", f.Fix)
		return nil, ""
	case !k.IsNumber():
		b.fault(path, quoted(Text(key)), "does not hold a number", "name a key that holds a number")
		return nil, ""
	case strings.Count(k.Path, "*") > 1 && !b.has(at), strings.Count(k.Path, "*") == 1 && !arrayTables[topOf(at)] && !b.has(at):
		b.fault(path, quoted(Text(key)), "names an element that the case does not have", "count elements from 1")
		return nil, ""
	}
	return k, at
}

// CheckOptions tries each option and the first value of each sweep on the case,
// so that a fault in one is found before anything runs. Build does it; With
// leaves it to its caller, as one option need not fit beside another.
func (c *Case) CheckOptions() Faults {
	if len(c.Option)+len(c.Sweep) == 0 {
		return nil
	}
	b := &builder{c: c, given: map[string]Entry{}, bad: map[string]bool{}}
	for _, e := range c.entries {
		b.given[e.Path] = e
	}
	bare := *b.c
	bare.Option, bare.Sweep = nil, nil
	bare.entries = without(b.c.entries, func(p string) bool { return topOf(p) == "option" || topOf(p) == "sweep" })
	for i := range b.c.Option {
		b.tryOption(i, &bare)
	}
	for i, s := range b.c.Sweep {
		v := s.From.Value
		if len(s.Values) > 0 {
			v = s.Values[0]
		}
		if _, faults := bare.With([]Setting{{s.Key, Num(v)}}); len(faults) > 0 {
			b.fault("sweep."+strconv.Itoa(i+1)+".key", strconv.Quote(s.Key), fmt.Sprintf("cannot be %s in this case: %s", plainNumber(v), faults[0].Error()), "")
		}
	}
	return b.faults
}

// ofTheRun are keys that say how the case and all its options are run and judged
// together.
var ofTheRun = map[string]bool{"run.seed": true, "run.replicates": true, "run.draws": true, "run.baseline": true, "question.limit": true, "question.confidence": true}

func (b *builder) tryOption(i int, bare *Case) {
	o := b.c.Option[i]
	set := "option." + strconv.Itoa(i+1) + ".set"
	label := "option." + firstNonEmpty(o.Name, strconv.Itoa(i+1)) + ".set: "
	if len(o.Set) == 0 {
		b.missing(set, `write set = { "harvest.control.take" = 4 }`)
		return
	}
	written := map[string]string{} // path by position -> as the option writes it
	for _, s := range o.Set {
		at, fault := bare.Lookup(s.Path)
		if fault != nil {
			continue // With says it
		}
		if other, twice := written[at]; twice {
			b.ofKey(set+"."+s.Path, s.Value.String(), "is set twice (also as "+other+")", "keep one of them")
		}
		written[at] = s.Path
		if ofTheRun[at] || strings.HasPrefix(at, "case.") {
			b.ofKey(set+"."+s.Path, s.Value.String(), "cannot be set by an option: every option is run and judged as the case is", "set it in the case")
		}
	}
	_, faults := bare.With(o.Set)
	for _, f := range faults {
		f.Key, f.unused = label+f.Key, false
		at, ok := written[f.Path], written[f.Path] != ""
		for end := strings.LastIndexByte(f.Path, '.'); !ok && end > 0; end = strings.LastIndexByte(f.Path[:end], '.') {
			at, ok = written[f.Path[:end]], written[f.Path[:end]] != ""
		}
		switch {
		case ok:
			f.Path = set + "." + at
		case b.has(set + "." + f.Path):
			f.Path = set + "." + f.Path
		default:
			f.Path, f.OfKey = set, true
		}
		b.add(f)
	}
}

func firstNonEmpty(a, b string) string {
	if a != "" {
		return a
	}
	return b
}
