package sweep

import (
	"math"
	"sort"
	"strconv"
	"strings"
	"sync"

	"ebbline/pva/ensemble"
	"ebbline/pva/rates"
	"ebbline/pva/year"
)

// Lengths of the unit of work. A unit is a group of cells over a range of
// replicates, so that a year's weather is drawn once for all of its cells. How
// long it takes is counted in operations and never timed, so that the cut is
// the same on every machine.
const (
	groupCells  = 64
	unitOps     = 3e10 // about 30 s on one slow core
	fewestUnits = 32   // of a small study, so that workers and shards have something to share
	leastRange  = ensemble.Lanes
)

// plan is how a study is cut into units.
type plan struct {
	study      *Study
	replicates int64
	groups     []group
	rangeSize  int64
	ranges     int // of replicates
	engines    engines
}

// group is up to 64 cells that are run together.
type group struct {
	cells     []int
	baselines [][]int // for each baseline, the cells (by place in the group) that it belongs to
}

func newPlan(s *Study) *plan {
	p := &plan{study: s, replicates: s.Base.Run.Replicates}
	p.group()
	heaviest := 0.0
	for _, g := range p.groups {
		heaviest = math.Max(heaviest, float64(g.variants()))
	}
	// The case stands for its cells: what a unit takes is only a guide.
	ops := heaviest * opsPerReplicate(s.base)
	size := unitOps / ops
	if total := float64(p.replicates) * float64(len(p.groups)); total/size < fewestUnits {
		size = math.Max(total/fewestUnits, leastRange)
	}
	p.rangeSize = max(1, int64(math.Min(size, float64(p.replicates)))/ensemble.Lanes) * ensemble.Lanes
	p.ranges = int((p.replicates + p.rangeSize - 1) / p.rangeSize)
	return p
}

// group puts cells that share a baseline side by side: the permitted take
// changes fastest, whatever the order of the dimensions.
func (p *plan) group() {
	s := p.study
	order := make([]int, s.n)
	keys := make([]string, s.n)
	for i := range order {
		order[i], keys[i] = i, s.baselineKey(i)
	}
	sort.SliceStable(order, func(a, b int) bool { return keys[order[a]] < keys[order[b]] })
	for len(order) > 0 {
		n := min(len(order), groupCells)
		g := group{cells: append([]int(nil), order[:n]...)}
		sort.Ints(g.cells)
		if s.hasBaseline() {
			at := map[string]int{}
			for place, i := range g.cells {
				b, known := at[keys[i]]
				if !known {
					b = len(g.baselines)
					at[keys[i]] = b
					g.baselines = append(g.baselines, nil)
				}
				g.baselines[b] = append(g.baselines[b], place)
			}
		}
		p.groups = append(p.groups, g)
		order = order[n:]
	}
}

// variants is how many cases a group's engine runs: the case, the baselines, the cells.
func (g group) variants() int { return 1 + len(g.baselines) + len(g.cells) }

// hasBaseline says whether cells are held against themselves without the take.
func (s *Study) hasBaseline() bool {
	permitted, _ := s.Base.Takes()
	return permitted && s.Base.Run.Baseline
}

// baselineKey is the same for cells whose baselines are the same case: it leaves
// out what only the permitted take hangs on.
func (s *Study) baselineKey(i int) string {
	if !s.hasBaseline() {
		return ""
	}
	var b strings.Builder
	for _, set := range s.cell(i) {
		if s.ofPermittedTake(set.Path) {
			continue
		}
		b.WriteString(set.Path + "=" + set.Value.String() + "\n")
	}
	return b.String()
}

// ofPermittedTake says whether a path belongs to a take that the baseline is without.
func (s *Study) ofPermittedTake(path string) bool {
	at, fault := s.Base.Lookup(path)
	if fault != nil {
		return false
	}
	rest, ok := strings.CutPrefix(at, "harvest.")
	if !ok {
		return false
	}
	row, _, _ := strings.Cut(rest, ".")
	n, err := strconv.Atoi(row)
	return err == nil && n >= 1 && n <= len(s.Base.Harvest) && !s.Base.Harvest[n-1].Existing
}

// units is the number of units. Unit u is group u / ranges over range u % ranges:
// the cells of a group are finished one group after another.
func (p *plan) units() int { return len(p.groups) * p.ranges }

func (p *plan) unit(u int) (group int, first, replicates int64) {
	first = int64(u%p.ranges) * p.rangeSize
	return u / p.ranges, first, min(p.rangeSize, p.replicates-first)
}

// engine builds the simulator of a group.
func (p *plan) engine(g int) (*compiled, error) {
	gr := p.groups[g]
	models := []*rates.Model{p.study.base}
	cells := make([]*rates.Model, len(gr.cells))
	for place, i := range gr.cells {
		m, err := p.study.model(i)
		if err != nil {
			return nil, err
		}
		cells[place] = m
	}
	baseline := make([]int, gr.variants())
	for i := range baseline {
		baseline[i] = -1
	}
	for b, places := range gr.baselines {
		// Any cell of the baseline's will do: without the take they are the same.
		m, faults := rates.NewKeeping(cells[places[0]].Case.Baseline(), p.study.base)
		if len(faults) > 0 {
			return nil, faults[0]
		}
		models = append(models, m)
		for _, place := range places {
			baseline[1+len(gr.baselines)+place] = 1 + b
		}
	}
	models = append(models, cells...)
	e, err := year.New(p.study.Base.Run.Seed, models...)
	if err != nil {
		return nil, err
	}
	return &compiled{engine: e, baseline: baseline, models: models}, nil
}

// compiled is a group ready to run.
type compiled struct {
	engine   *year.Engine
	baseline []int // of each variant
	models   []*rates.Model
}

// opsPerReplicate is about how many nanoseconds of one slow core a replicate of
// a case takes.
func opsPerReplicate(m *rates.Model) float64 {
	c := m.Case
	perYear := 150 + 40*float64(len(c.Harvest)+len(c.Stocking)+len(c.Catastrophe))
	if c.Births.Breeding == "flow" {
		s := rates.PlanSubsteps(m)
		n := c.Start.Abundance
		for _, k := range []float64{c.Births.Crowding.Capacity.Value, c.Deaths.Crowding.Capacity.Value} {
			n = math.Max(n, k)
		}
		n = math.Min(math.Min(n, s.EventsBelow), c.Ceiling.Or(n))
		perYear += 10 * (m.Birth.Mean + m.Death.Mean()) * math.Max(0, n)
		if !math.IsInf(s.EventsBelow, 1) {
			perYear += 160 * float64(s.Substeps)
		}
	}
	return perYear * float64(c.Question.Horizon)
}

// engines keeps the compiled groups that are in work.
type engines struct {
	mu   sync.Mutex
	open map[int]*sync.Once
	made map[int]*compiled
	errs map[int]error
}

// compiledGroup builds a group's engine once for all workers.
func (r *Runner) compiledGroup(g int) (*compiled, error) {
	e := &r.plan.engines
	e.mu.Lock()
	if e.open == nil {
		e.open, e.made, e.errs = map[int]*sync.Once{}, map[int]*compiled{}, map[int]error{}
	}
	once := e.open[g]
	if once == nil {
		once = new(sync.Once)
		e.open[g] = once
	}
	e.mu.Unlock()
	once.Do(func() {
		c, err := r.plan.engine(g)
		e.mu.Lock()
		e.made[g], e.errs[g] = c, err
		e.mu.Unlock()
	})
	e.mu.Lock()
	defer e.mu.Unlock()
	return e.made[g], e.errs[g]
}

// forget lets go of a group that is finished.
func (p *plan) forget(g int) {
	p.engines.mu.Lock()
	defer p.engines.mu.Unlock()
	delete(p.engines.made, g)
}
