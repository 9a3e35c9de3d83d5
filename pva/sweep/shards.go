package sweep

import (
	"errors"
	"fmt"
	"io/fs"
	"strconv"

	"ebbline/pva/sweep/ledger"
)

// Work says into how many units a study is cut, and about how many seconds of
// one slow core they take together: operations are counted and nothing is timed.
func (s *Study) Work() (units int, seconds float64) {
	p := newPlan(s)
	variants := 0
	for _, g := range p.groups {
		variants += g.variants()
	}
	return p.units(), float64(variants) * float64(p.replicates) * opsPerReplicate(s.base) / opsPerSecond
}

// opsPerSecond is what unitOps counts on.
const opsPerSecond = 1e9

// Manifest is what the ledgers of a study say, for a folder that holds several.
func (s *Study) Manifest(opt Options) ledger.Manifest { return newRunner(s, opt).manifest() }

// ShardUnits is how many of so many units belong to a shard (from 1 to shards).
func ShardUnits(units, shard, shards int) int { return (units + shards - shard) / shards }

// Held says which units of a run the ledger in a folder holds: none if there is
// no such folder. It changes nothing on disk. A ledger of another run is an error.
func Held(dir string, m ledger.Manifest) (units []int, damage []ledger.Damage, err error) {
	had, err := ledger.ReadManifest(dir)
	if errors.Is(err, fs.ErrNotExist) {
		return nil, nil, nil
	}
	if err != nil {
		return nil, nil, err
	}
	if d := m.Difference(had); d != "" {
		return nil, nil, fmt.Errorf("ledger %s %w: %s", dir, ledger.ErrOther, d)
	}
	l, err := ledger.Open(dir, m, "")
	if err != nil {
		return nil, nil, err
	}
	damage, err = l.Read(func(key string, _ []byte) error {
		if key[:min(1, len(key))] != unitMark {
			return nil
		}
		u, err := strconv.Atoi(key[1:])
		if err != nil || u < 0 || u >= m.Units {
			return fmt.Errorf("ledger %s: there is no unit %q in this run", dir, key)
		}
		units = append(units, u)
		return nil
	})
	return units, damage, err
}
