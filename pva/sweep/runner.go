package sweep

import (
	"errors"
	"fmt"
	"hash/maphash"
	"io/fs"
	"runtime"
	"strconv"
	"strings"
	"sync"

	"ebbline/pva"
	"ebbline/pva/sweep/ledger"
)

// Options say how a study is run. They change no figure.
type Options struct {
	Workers int    // 0: as many as there are cores
	Ledger  string // folder in which finished units are kept; "" keeps none
	Resume  bool   // go on with a ledger that holds some of this run
	Restart bool   // throw away what such a ledger holds
	// Shard of Shards (from 1) is all that is run; 0 of 0 is everything.
	Shard, Shards int
	Command       string // "sweep" or "minimum", for the manifest
	Arguments     string // those of the command line that decide what is run, for the manifest
	CaseText      string // the case as a case file, for the manifest
	CaseFile      string
	Example       string
	// Progress is called as work is done, in cell-replicates, from any
	// goroutine, with the name of what is being done; may be nil.
	Progress func(stage string, done, total int64)
	// Finished is called with the cells of a grid that have just become
	// complete, by one goroutine at a time; may be nil.
	Finished func(cells []*Outcome)
}

// Runner is a study being run: its cut into units, its ledger, and what is
// known so far. Close it.
type Runner struct {
	opt    Options
	study  *Study
	plan   *plan
	ledger *ledger.Ledger

	mu     sync.Mutex
	state  []groupState
	done   []bool              // by unit
	points map[string][]uint64 // what the search has simulated, by key

	// Damage is what was found wrong in the ledger; it is computed again.
	Damage []ledger.Damage
	// Before is how many units the ledger held at the beginning.
	Before int
}

// groupState is what is known of a group: merged tallies and the number of ranges in them.
type groupState struct {
	tallies []Tally // by variant
	ranges  int
}

// ErrHolds is wrapped by the error of a ledger that already holds some of this run.
var ErrHolds = errors.New("already holds some of this very run")

// Open prepares a study and reads its ledger.
func Open(s *Study, opt Options) (*Runner, error) {
	if opt.Workers <= 0 {
		opt.Workers = runtime.NumCPU()
	}
	if opt.Shards < 0 || opt.Shard < 0 || opt.Shard > opt.Shards || (opt.Shards > 0 && opt.Shard == 0) {
		return nil, fmt.Errorf("shard %d of %d: give a number from 1 to the number of shards", opt.Shard, opt.Shards)
	}
	r := newRunner(s, opt)
	if opt.Ledger == "" {
		return r, nil
	}
	if opt.Restart {
		if _, err := ledger.ReadManifest(opt.Ledger); err == nil || !errors.Is(err, fs.ErrNotExist) {
			if err := ledger.Remove(opt.Ledger); err != nil {
				return nil, err
			}
		}
	}
	label := ""
	if opt.Shards > 0 {
		label = fmt.Sprintf("shard%d", opt.Shard)
	}
	l, err := ledger.Open(opt.Ledger, r.manifest(), label)
	if err != nil {
		return nil, err
	}
	r.ledger = l
	if err := r.read(l); err != nil {
		return nil, err
	}
	mine := 0
	for u, done := range r.done {
		if done && r.mine(u) {
			mine++
		}
	}
	r.Before = mine
	if (mine > 0 || len(r.points) > 0) && !opt.Resume {
		return nil, fmt.Errorf("ledger %s %w (%d of %d units): give --resume to go on with it, or --force to throw it away and start over", opt.Ledger, ErrHolds, mine, r.units())
	}
	return r, nil
}

func newRunner(s *Study, opt Options) *Runner {
	r := &Runner{opt: opt, study: s, plan: newPlan(s), points: map[string][]uint64{}}
	r.state = make([]groupState, len(r.plan.groups))
	for g := range r.state {
		r.state[g].tallies = make([]Tally, r.plan.groups[g].variants())
	}
	r.done = make([]bool, r.plan.units())
	return r
}

// Close closes the ledger.
func (r *Runner) Close() error {
	if r.ledger == nil {
		return nil
	}
	return r.ledger.Close()
}

// mine says whether a unit is of this runner's shard.
func (r *Runner) mine(u int) bool {
	return r.opt.Shards == 0 || u%r.opt.Shards == r.opt.Shard-1
}

// units is how many units this runner's shard has.
func (r *Runner) units() int {
	n := 0
	for u := range r.done {
		if r.mine(u) {
			n++
		}
	}
	return n
}

func (r *Runner) manifest() ledger.Manifest {
	c := r.study.Base
	var overridden []string
	for _, e := range c.Entries() {
		if e.Origin == pva.FromOverride {
			overridden = append(overridden, e.Path)
		}
	}
	return ledger.Manifest{
		Program: "ebbline", Format: ledger.Format, Version: pva.Version, Command: r.opt.Command, Arguments: r.opt.Arguments,
		Title: c.Title, Digest: c.Digest(), Seed: c.Run.Seed, Replicates: c.Run.Replicates,
		What: r.study.what(), Cells: r.study.n, Group: groupCells, Range: r.plan.rangeSize, Units: r.plan.units(),
		Case: r.opt.CaseText, CaseFile: r.opt.CaseFile, Example: r.opt.Example, Overridden: overridden,
	}
}

// read takes in what a ledger holds.
func (r *Runner) read(l *ledger.Ledger) error { return r.readOnce(l, map[string]source{}) }

// readOnce takes in what a ledger holds beyond what was read from others, which
// must hold the same where both hold something.
func (r *Runner) readOnce(l *ledger.Ledger, from map[string]source) error {
	damage, err := l.Read(func(key string, data []byte) error {
		sum := maphash.Bytes(recordSeed, data)
		if had, twice := from[key]; twice {
			if had.sum != sum {
				return fmt.Errorf("ledgers %s and %s hold different figures for the same part of the run (%s): one of them was made by another program or on a machine that errs", had.dir, l.Dir(), key)
			}
			return nil
		}
		from[key] = source{sum, l.Dir()}
		switch key[:min(1, len(key))] {
		case unitMark:
			u, err := strconv.Atoi(key[1:])
			if err != nil || u < 0 || u >= len(r.done) {
				return fmt.Errorf("ledger %s: there is no unit %q in this run", l.Dir(), key)
			}
			if err := r.takeUnit(u, data); err != nil {
				return fmt.Errorf("ledger %s: unit %d: %w", l.Dir(), u+1, err)
			}
			return nil
		case pointMark:
			words, err := readWords(data)
			if err != nil {
				return fmt.Errorf("ledger %s: %w", l.Dir(), err)
			}
			r.points[key] = words
			return nil
		}
		return fmt.Errorf("ledger %s: a record of an unknown kind (%q)", l.Dir(), key)
	})
	r.Damage = append(r.Damage, damage...)
	return err
}

// recordSeed is of this process: the sums are compared within it only.
var recordSeed = maphash.MakeSeed()

// The marks of record keys.
const (
	unitMark  = "u"
	pointMark = "p"
)

// takeUnit adds a unit's record to its group.
func (r *Runner) takeUnit(u int, data []byte) error {
	g, _, replicates := r.plan.unit(u)
	s := &r.state[g]
	tallies := make([]Tally, len(s.tallies))
	var err error
	for i := range tallies {
		if data, err = tallies[i].read(data); err != nil {
			return err
		}
		if tallies[i].Replicates != replicates {
			return fmt.Errorf("it is of %d replicates and not of %d", tallies[i].Replicates, replicates)
		}
	}
	if len(data) > 0 {
		return errors.New("its record is longer than its tallies")
	}
	r.add(u, tallies)
	return nil
}

func (r *Runner) add(u int, tallies []Tally) {
	g := u / r.plan.ranges
	s := &r.state[g]
	for i := range tallies {
		s.tallies[i].Merge(&tallies[i])
	}
	s.ranges++
	r.done[u] = true
}

// Missing names the units that are not done, as ranges: "3, 7 to 9".
func (r *Runner) Missing() string {
	var parts []string
	for u := 0; u < len(r.done); u++ {
		if r.done[u] {
			continue
		}
		from := u
		for u+1 < len(r.done) && !r.done[u+1] {
			u++
		}
		switch {
		case from == u:
			parts = append(parts, strconv.Itoa(from+1))
		case len(parts) > 20:
		default:
			parts = append(parts, fmt.Sprintf("%d to %d", from+1, u+1))
		}
	}
	if len(parts) > 20 {
		parts = append(parts[:20], fmt.Sprintf("and %d more places", len(parts)-20))
	}
	return strings.Join(parts, ", ")
}
