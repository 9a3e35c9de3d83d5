package sweep

import (
	"fmt"
	"math"
	"strings"

	"ebbline/pva"
	"ebbline/pva/rates"
)

// Warnings are the doubts about a sweep that its reader must know of. The search
// may be nil.
func (r *Result) Warnings(search *Crossing) []pva.Warning {
	out := r.Study.Warnings()
	if r.Unsolved > 0 {
		out = append(out, pva.Warning{Key: "births.crowding.capacity", Text: fmt.Sprintf("in %s no scale reaches the capacity; the case's own scales are kept there", cells(r.Unsolved))})
	}
	outgrown := 0
	for _, o := range r.Cells {
		if o != nil && o.Outgrown > 0 {
			outgrown++
		}
	}
	if outgrown > 0 {
		out = append(out, pva.Warning{Key: "run.stop_above", Text: fmt.Sprintf("in %s some replicates outgrew %g units and stopped; they count as not fallen, and means of takes are over the years before (an assessment averages year by year, which differs then)",
			cells(outgrown), r.Study.Base.Run.StopAbove)})
	}
	shift := r.SubstepShift
	if search != nil {
		shift = math.Max(shift, search.SubstepShift)
	}
	return append(out, substepWarning(shift)...)
}

// Warnings are the doubts about a search of its own, as for the minimum size.
func (c *Crossing) Warnings(s *Study) []pva.Warning {
	return append(s.Warnings(), substepWarning(c.SubstepShift)...)
}

// Warnings are the doubts about a study that do not depend on its outcome.
func (s *Study) Warnings() []pva.Warning {
	if len(s.Base.Uncertain) == 0 {
		return nil
	}
	var keys []string
	for _, u := range s.Base.Uncertain {
		keys = append(keys, u.Key)
	}
	return []pva.Warning{{Key: "uncertain", Text: "inputs that the case marks as uncertain (" + strings.Join(keys, ", ") + ") are taken at their stated values: what they are unsure by is not in these risks and intervals"}}
}

// mostBounded is how many cells of a study are held against the bound of
// sub-steps: evenly spread ones of a larger study, as the bound changes slowly
// from cell to cell.
const mostBounded = 128

// shift is the most that sub-steps are estimated to shift a risk of the study.
func (s *Study) shift() float64 {
	most := shiftOf(s.base)
	n := min(s.n, mostBounded)
	for k := range n {
		i := k
		if n > 1 {
			i = k * (s.n - 1) / (n - 1)
		}
		if m, err := s.model(i); err == nil {
			most = math.Max(most, shiftOf(m))
		}
	}
	return most
}

// shift is the same over the values looked at without the exact answer.
func (c *curve) shift() float64 {
	most := 0.0
	for _, p := range c.points {
		if p.model != nil && p.Exact == nil {
			most = math.Max(most, shiftOf(p.model))
		}
	}
	return most
}

func shiftOf(m *rates.Model) float64 {
	if b := rates.BoundSubsteps(m); b != nil && b.Substeps > 0 {
		return b.RiskBound
	}
	return 0
}

// negligible is a shift of a probability that is not worth a warning.
const negligible = 0.005

func substepWarning(shift float64) []pva.Warning {
	if shift <= negligible {
		return nil
	}
	return []pva.Warning{{Key: "run.substeps", Text: fmt.Sprintf("sub-steps may shift a probability here by about %.2g; more of them, or events, narrow that", shift)}}
}

func cells(n int) string {
	if n == 1 {
		return "1 cell"
	}
	return fmt.Sprintf("%d cells", n)
}
