package sweep

import (
	"errors"
	"fmt"

	"ebbline/pva/sweep/ledger"
)

// ErrMissing is wrapped by the error of a merge to which units are missing.
var ErrMissing = errors.New("not all of the sweep is there")

// Merge reads the ledgers of a study's shards into one runner, which keeps no
// ledger of its own. A ledger of another case, version, seed or grid is refused
// with the difference named; so is a unit of which two ledgers hold different
// figures. If units are missing the error names them and wraps ErrMissing, and
// the runner holds what is there.
func Merge(s *Study, dirs []string, opt Options) (*Runner, error) {
	r := newRunner(s, opt)
	m := r.manifest()
	from := map[string]source{}
	for _, dir := range dirs {
		had, err := ledger.ReadManifest(dir)
		if err != nil {
			return nil, err
		}
		if d := m.Difference(had); d != "" {
			return nil, fmt.Errorf("ledger %s cannot be merged with the others: %s", dir, d)
		}
		l, err := ledger.Open(dir, m, "")
		if err != nil {
			return nil, err
		}
		if err := r.readOnce(l, from); err != nil {
			return nil, err
		}
	}
	for _, done := range r.done {
		if done {
			r.Before++
		}
	}
	if missing := r.Missing(); missing != "" {
		return r, fmt.Errorf("%w: %d of %d units are missing (%s)%s", ErrMissing, len(r.done)-r.Before, len(r.done), missing, r.missingShards())
	}
	return r, nil
}

// source says where a record was first seen.
type source struct {
	sum uint64
	dir string
}

// missingShards says to which shards the missing units belong, where one number
// of shards explains all of them.
func (r *Runner) missingShards() string {
	for n := 2; n <= min(1000, len(r.done)); n++ {
		var gone []int
		for i := range n {
			missing, total := 0, 0
			for u := i; u < len(r.done); u += n {
				total++
				if !r.done[u] {
					missing++
				}
			}
			if missing == total {
				gone = append(gone, i+1)
			} else if missing > 0 {
				gone = nil
				break
			}
		}
		if len(gone) == 1 {
			return fmt.Sprintf(": that is shard %d/%d", gone[0], n)
		}
		if len(gone) > 1 && len(gone) < n {
			s := ": those are shards"
			for _, i := range gone {
				s += fmt.Sprintf(" %d/%d", i, n)
			}
			return s
		}
	}
	return ""
}
