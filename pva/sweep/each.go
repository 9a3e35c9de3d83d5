package sweep

import (
	"cmp"
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"ebbline/pva"
)

// NewEach is a case with each of its inputs about the population changed alone,
// down and up by the fraction given (0.1 is 10 %), and with structures the other
// defensible forms of its model too. Inputs that cannot be changed so are listed
// in Left with the reason.
func NewEach(c *pva.Case, by float64, structures bool) (*Study, error) {
	if !(by > 0 && by < 1) {
		return nil, fmt.Errorf("--each %v %%: give a change above 0 and below 100 %%, such as 10%%", 100*by)
	}
	s := &Study{Kind: Each}
	if err := s.startPlain(c); err != nil {
		return nil, err
	}
	for _, e := range pva.Ordered(c.Entries()) {
		if k, _ := pva.Find(e.Path); k != nil && e.Value.Kind == pva.NumberKind && isInput(k) {
			s.change(e, k, by)
		}
	}
	if structures {
		s.Kind = Both
		if err := s.addForms(); err != nil {
			return nil, err
		}
	}
	return s.finish()
}

// NewStructures is a case under the other defensible forms of its model alone.
func NewStructures(c *pva.Case) (*Study, error) {
	s := &Study{Kind: Structures}
	if err := s.startPlain(c); err != nil {
		return nil, err
	}
	if err := s.addForms(); err != nil {
		return nil, err
	}
	return s.finish()
}

func (s *Study) finish() (*Study, error) {
	s.n = len(s.Changes)
	if s.n == 0 {
		return nil, errors.New("there is nothing to change in this case")
	}
	s.cell = func(i int) []pva.Setting { return s.Changes[i].Set }
	return s, s.try()
}

// isInput says whether a key says something about the population or what is done
// to it, so that it can be in doubt by some percent: not the question, the run,
// dates, or what a number is quoted in.
func isInput(k *pva.Key) bool {
	if k.Whole || !k.IsNumber() {
		return false
	}
	top, rest, _ := strings.Cut(k.Path, ".")
	switch top {
	case "start", "births", "deaths", "weather", "catastrophe", "harvest", "stocking", "ceiling":
	default:
		return false
	}
	return rest != "per" && rest != "cycle.phase"
}

// change adds the two cells of an input, or says why there are none.
func (s *Study) change(e pva.Entry, k *pva.Key, by float64) {
	name := s.Base.Display(e.Path)
	if e.Path == "deaths.crowding.capacity" && s.Base.Births.Crowding.Capacity.Set {
		return // the one capacity is changed on both sides at once
	}
	if e.Value.Num == 0 {
		s.Left = append(s.Left, LeftOut{name, "it is 0, of which no percentage is another number"})
		return
	}
	for _, times := range []float64{1 - by, 1 + by} {
		to := math.Max(k.Min, math.Min(k.Max, nearestDecimal(e.Value.Num*times)))
		set := []pva.Setting{{Path: e.Path, Value: pva.Num(to)}}
		if e.Path == "births.crowding.capacity" || e.Path == "deaths.crowding.capacity" {
			set = s.bothCapacities(set, to)
		}
		if to == e.Value.Num {
			s.Left = append(s.Left, LeftOut{name, fmt.Sprintf("%v is the end of what it may be", to)})
			continue
		}
		if _, err := modelOf(s.plain, s.base, set, false); err != nil {
			s.Left = append(s.Left, LeftOut{name, fmt.Sprintf("it cannot be %v: %v", to, oneLine(err))})
			continue
		}
		s.Changes = append(s.Changes, Change{Kind: Each, Key: name, Path: e.Path, From: e.Value.Num, To: to, Set: set})
	}
}

// bothCapacities keeps the capacities of both sides equal, where both are given.
func (s *Study) bothCapacities(set []pva.Setting, to float64) []pva.Setting {
	if s.Base.Births.Crowding.Capacity.Set && s.Base.Deaths.Crowding.Capacity.Set {
		return []pva.Setting{{Path: "births.crowding.capacity", Value: pva.Num(to)}, {Path: "deaths.crowding.capacity", Value: pva.Num(to)}}
	}
	return set
}

func oneLine(err error) string { return strings.ReplaceAll(err.Error(), "\n", "; ") }

// form is one form of the model in words.
type form struct {
	name           string
	births, deaths string
}

// The forms of crowding that are tried; theta and what the case itself uses come
// from the case.
var forms = []form{
	{"crowding in births, linear", "linear", "none"},
	{"crowding in births, Ricker", "ricker", "none"},
	{"crowding in births, hyperbolic", "hyperbolic", "none"},
	{"crowding in deaths, linear", "none", "linear"},
	{"crowding in both, linear", "linear", "linear"},
	{"crowding in both, Ricker births", "ricker", "linear"},
	{"crowding in both, hyperbolic births", "hyperbolic", "linear"},
}

// memoryTried is the memory of the weather that a case without one is tried with
// (common practice, no source).
const memoryTried = 0.3

// addForms adds a cell for each form with the same rates and the same capacity
// as the case, with and without memory of the weather.
func (s *Study) addForms() error {
	c := s.Base
	capacity := 0.0
	crowded := c.Births.Crowding.Form != "none" || c.Deaths.Crowding.Form != "none"
	if crowded {
		k, err := capacityOf(s.base)
		if err != nil {
			return fmt.Errorf("structures: %w", err)
		}
		capacity = k
	} else {
		s.Left = append(s.Left, LeftOut{"forms of crowding", "the case has no crowding, and so no capacity that they could share"})
	}
	varies := s.base.Birth.Sigma != 0 || s.base.Death.Varies()
	type weather struct {
		name   string
		memory float64
		stated bool
	}
	weathers := []weather{{"", c.Weather.Memory, true}}
	switch {
	case !varies:
		s.Left = append(s.Left, LeftOut{"memory of the weather", "the case has no weather"})
	case c.Weather.Memory == 0:
		weathers = append(weathers, weather{fmt.Sprintf("memory of %v", memoryTried), memoryTried, false})
	default:
		weathers = append(weathers, weather{"no memory", 0, false})
	}
	all := []form{{"as stated", c.Births.Crowding.Form, c.Deaths.Crowding.Form}}
	if crowded {
		for _, f := range forms {
			if f.births != c.Births.Crowding.Form || f.deaths != c.Deaths.Crowding.Form {
				all = append(all, f)
			}
		}
	}
	for i, f := range all {
		for _, w := range weathers {
			if i == 0 && w.stated {
				continue // the case itself
			}
			ch := Change{Kind: Structures, Name: f.name}
			if i > 0 {
				ch.Set = append(ch.Set, crowdingAs("births", f.births, capacity)...)
				ch.Set = append(ch.Set, crowdingAs("deaths", f.deaths, capacity)...)
			}
			if !w.stated {
				ch.Name += ", " + w.name
				ch.Set = append(ch.Set, pva.Setting{Path: "weather.memory", Value: pva.Num(w.memory)})
			}
			// A form that cannot have this capacity is no other form of the case.
			if _, err := modelOf(s.plain, s.base, ch.Set, true); err != nil {
				s.Left = append(s.Left, LeftOut{ch.Name, oneLine(err)})
				continue
			}
			s.Changes = append(s.Changes, ch)
		}
	}
	return nil
}

func crowdingAs(side, form string, capacity float64) []pva.Setting {
	set := []pva.Setting{{Path: side + ".crowding.form", Value: pva.Text(form)}}
	if form != "none" {
		set = append(set, pva.Setting{Path: side + ".crowding.capacity", Value: pva.Num(capacity)})
	}
	return set
}

// Influence is what one input does to the risk when it is changed alone. A side
// that could not be changed is nil.
type Influence struct {
	Key, Path string
	Value     float64
	Less      *Outcome // with less of it
	More      *Outcome
	LessTo    float64
	MoreTo    float64
	// Span is how far apart the largest and the smallest of the risks are: with
	// less, as stated, with more.
	Span float64
}

// Influences are the inputs of a finished study, the one that moves the risk
// most first. Equals stay in the order of the case.
func Influences(r *Result) []Influence {
	var out []Influence
	at := map[string]int{}
	for i, ch := range r.Study.Changes {
		if ch.Kind != Each || r.Cells[i] == nil || r.Case == nil {
			continue
		}
		j, known := at[ch.Path]
		if !known {
			j = len(out)
			at[ch.Path] = j
			out = append(out, Influence{Key: ch.Key, Path: ch.Path, Value: ch.From})
		}
		if in := &out[j]; ch.To < ch.From {
			in.Less, in.LessTo = r.Cells[i], ch.To
		} else {
			in.More, in.MoreTo = r.Cells[i], ch.To
		}
	}
	for i := range out {
		low, high := r.Case.Risk.Estimate, r.Case.Risk.Estimate
		for _, o := range []*Outcome{out[i].Less, out[i].More} {
			if o != nil {
				low, high = math.Min(low, o.Risk.Estimate), math.Max(high, o.Risk.Estimate)
			}
		}
		out[i].Span = high - low
	}
	slices.SortStableFunc(out, func(a, b Influence) int { return cmp.Compare(b.Span, a.Span) })
	return out
}

// Span is the smallest and the largest risk of a kind of doubt, and what gave them.
type Span struct {
	Low, High     float64
	LowBy, HighBy string
	Cells         int
}

// Doubts are the three sources of doubt in a risk, side by side: the replicates
// (the case's own interval), the inputs changed one at a time, the other forms.
type Doubts struct {
	Replicates pva.Proportion
	Inputs     Span
	Forms      Span
}

// DoubtsOf sums up a finished study.
func DoubtsOf(r *Result) Doubts {
	d := Doubts{Replicates: r.Case.Risk}
	stated := r.Case.Risk.Estimate
	d.Inputs = Span{Low: stated, High: stated, LowBy: "the case as stated", HighBy: "the case as stated"}
	d.Forms = d.Inputs
	for i, ch := range r.Study.Changes {
		o := r.Cells[i]
		if o == nil {
			continue
		}
		span := &d.Inputs
		if ch.Kind == Structures {
			span = &d.Forms
		}
		span.Cells++
		if o.Risk.Estimate < span.Low {
			span.Low, span.LowBy = o.Risk.Estimate, ch.label()
		}
		if o.Risk.Estimate > span.High {
			span.High, span.HighBy = o.Risk.Estimate, ch.label()
		}
	}
	return d
}
