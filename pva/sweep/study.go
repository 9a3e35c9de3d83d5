package sweep

import (
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"runtime"
	"slices"
	"strconv"
	"strings"
	"sync"
	"sync/atomic"

	"ebbline/pva"
	"ebbline/pva/rates"
)

// MostCells is the largest number of cells of a study.
const MostCells = 100_000

// Study is a case and the variants of it that are to be run side by side, each
// a cell. It is immutable and safe for many goroutines.
type Study struct {
	Kind Kind
	Base *pva.Case
	// Dimensions are those of a grid, in the order of the case; the last one
	// changes fastest from cell to cell.
	Dimensions []Dimension
	// Changes says what each cell of the other studies is.
	Changes []Change
	// Left are the inputs or forms that have no cell, each with its reason.
	Left []LeftOut

	base   *rates.Model
	plain  *pva.Case // what cells are made from: the case, or the case without laws of uncertain inputs
	n      int
	cell   func(i int) []pva.Setting
	strict bool // a capacity without a solution is a fault, not counted
	facts  []facts
}

// facts is what is wanted of a cell's case after it has been run.
type facts struct {
	limit      pva.Optional
	confidence float64
	horizon    int
	unsolved   bool
}

func factsOf(m *rates.Model) facts {
	q := m.Case.Question
	return facts{q.Limit, q.Confidence, q.Horizon, m.Unsolved}
}

// Kind is what a study varies.
type Kind string

// The kinds of study.
const (
	Grid       Kind = "grid"
	Each       Kind = "each input"
	Structures Kind = "structures"
	Both       Kind = "each input and structures"
)

// Dimension is one swept key with its values.
type Dimension struct {
	Key    string // by name, as people read it
	Path   string // by position
	Unit   string
	Values []float64
}

// Change is what one cell of a study that is no grid changes.
type Change struct {
	Kind     Kind // Each or Structures
	Key      string
	Path     string
	From, To float64 // Each: the value in the case and here
	Name     string  // Structures: the form in words
	Set      []pva.Setting
}

// LeftOut is something that could have been a cell and is not.
type LeftOut struct{ What, Reason string }

// NewGrid is the grid of a case's [[sweep]] tables, crossed. Every cell is tried
// first: the error names the first that is no valid case.
func NewGrid(c *pva.Case) (*Study, error) {
	if len(c.Sweep) == 0 {
		return nil, errors.New("the case has no [[sweep]] table: add one with a key and its values")
	}
	s := &Study{Kind: Grid, n: 1}
	if err := s.start(c); err != nil {
		return nil, err
	}
	for i, w := range c.Sweep {
		d, err := dimensionOf(c, w)
		if err != nil {
			return nil, fmt.Errorf("sweep.%d.key: %w", i+1, err)
		}
		s.Dimensions = append(s.Dimensions, d)
		if s.n *= len(d.Values); s.n > MostCells {
			return nil, fmt.Errorf("the grid has more than %d cells: give fewer values", MostCells)
		}
	}
	s.cell = func(i int) []pva.Setting {
		set := make([]pva.Setting, len(s.Dimensions))
		for d, v := range s.Values(i) {
			set[d] = pva.Setting{Path: s.Dimensions[d].Path, Value: pva.Num(v)}
		}
		return set
	}
	return s, s.try()
}

// start takes the case, which is run beside its cells.
func (s *Study) start(c *pva.Case) error {
	m, faults := rates.New(c)
	if len(faults) > 0 {
		return pva.Faults(faults)
	}
	s.Base, s.base, s.plain = c, m, c
	return nil
}

// startPlain takes the case, and makes its cells from it without the laws of
// uncertain inputs: these are not drawn here, and a law around an input that
// another form does not have must not stand in the way of that form.
func (s *Study) startPlain(c *pva.Case) error {
	if err := s.start(c); err != nil {
		return err
	}
	entries := slices.DeleteFunc(c.Entries(), func(e pva.Entry) bool {
		return strings.HasPrefix(e.Path, "uncertain.") || strings.HasPrefix(e.Path, "uncertain_pair.")
	})
	plain, faults := pva.Build(entries)
	if len(faults) > 0 {
		return faults
	}
	s.plain = plain
	return nil
}

func dimensionOf(c *pva.Case, w pva.Sweep) (Dimension, error) {
	path, fault := c.Lookup(w.Key)
	if fault != nil {
		return Dimension{}, *fault
	}
	k, _ := pva.Find(path)
	if k == nil || !k.IsNumber() {
		return Dimension{}, fmt.Errorf("%s holds no number", w.Key)
	}
	if strings.HasPrefix(path, "run.") {
		return Dimension{}, fmt.Errorf("%s says how the case is run and not what is asked or known; name another key", w.Key)
	}
	d := Dimension{Key: c.Display(path), Path: path, Unit: k.Unit, Values: w.Values}
	if len(w.Values) == 0 {
		// From + i step, never a running sum, so that the values are the
		// nearest doubles to what is meant.
		for i := 0; ; i++ {
			v := w.From.Value + float64(float64(i)*w.Step.Value)
			if v > w.To.Value+1e-9*w.Step.Value || i >= MostCells {
				break
			}
			d.Values = append(d.Values, nearestDecimal(v))
		}
	}
	return d, nil
}

// nearestDecimal is v rounded to 12 significant digits: 0.1 + 2 x 0.1 is 0.3.
func nearestDecimal(v float64) float64 {
	r, err := strconv.ParseFloat(strconv.FormatFloat(v, 'e', 11, 64), 64)
	if err != nil {
		return v
	}
	return r
}

// Cells is the number of cells.
func (s *Study) Cells() int { return s.n }

// Values are the values of a grid's cell, one a dimension.
func (s *Study) Values(i int) []float64 {
	if len(s.Dimensions) == 0 {
		return nil
	}
	out := make([]float64, len(s.Dimensions))
	for d := len(s.Dimensions) - 1; d >= 0; d-- {
		n := len(s.Dimensions[d].Values)
		out[d] = s.Dimensions[d].Values[i%n]
		i /= n
	}
	return out
}

// Settings is what a cell sets over the case.
func (s *Study) Settings(i int) []pva.Setting { return s.cell(i) }

// model is a cell as formulas.
func (s *Study) model(i int) (*rates.Model, error) {
	return modelOf(s.plain, s.base, s.cell(i), s.strict)
}

// modelOf is a case with settings as formulas. Where its capacity has no
// solution it keeps the case's scales, and says so in Unsolved, unless strict.
func modelOf(c *pva.Case, base *rates.Model, set []pva.Setting, strict bool) (*rates.Model, error) {
	vc, faults := c.With(set)
	if len(faults) > 0 {
		return nil, faults
	}
	var m *rates.Model
	var wrong []pva.Fault
	if strict {
		m, wrong = rates.New(vc)
	} else {
		m, wrong = rates.NewKeeping(vc, base)
	}
	if len(wrong) > 0 {
		return nil, pva.Faults(wrong)
	}
	return m, nil
}

// try makes every cell once, so that a fault in one is found before hours of
// running.
func (s *Study) try() error {
	workers := min(runtime.GOMAXPROCS(0), s.n)
	errs := make([]error, s.n)
	s.facts = make([]facts, s.n)
	var next atomic.Int64
	var failed atomic.Bool
	var wg sync.WaitGroup
	for range workers {
		wg.Add(1)
		go func() {
			defer wg.Done()
			for {
				i := int(next.Add(1) - 1)
				if i >= s.n || failed.Load() {
					return
				}
				m, err := s.model(i)
				if err != nil {
					errs[i] = err
					failed.Store(true)
					return
				}
				s.facts[i] = factsOf(m)
			}
		}()
	}
	wg.Wait()
	for i, err := range errs {
		if err != nil {
			return fmt.Errorf("cell %s: %w", s.Label(i), err)
		}
	}
	return nil
}

// Label names a cell by what it sets.
func (s *Study) Label(i int) string {
	if s.Kind != Grid {
		return s.Changes[i].label()
	}
	parts := make([]string, len(s.Dimensions))
	for d, v := range s.Values(i) {
		parts[d] = s.Dimensions[d].Key + " = " + pva.Num(v).Text
	}
	return strings.Join(parts, ", ")
}

func (c Change) label() string {
	if c.Kind == Structures {
		return c.Name
	}
	return c.Key + " = " + pva.Num(c.To).Text
}

// what is the study in words that change with it, for the manifest.
func (s *Study) what() string {
	h := sha256.New()
	var names []string
	for _, d := range s.Dimensions {
		fmt.Fprintln(h, d.Path, d.Values)
		names = append(names, fmt.Sprintf("%s (%d values)", d.Key, len(d.Values)))
	}
	for _, c := range s.Changes {
		fmt.Fprintln(h, c.Kind, c.Path, c.To, c.Name)
	}
	if len(s.Changes) > 0 {
		names = append(names, fmt.Sprintf("%d changes", len(s.Changes)))
	}
	return fmt.Sprintf("%s: %s, %s", s.Kind, strings.Join(names, " x "), hex.EncodeToString(h.Sum(nil))[:16])
}
