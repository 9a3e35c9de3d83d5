package casefile

import (
	"strconv"

	"ebbline/pva"
	"ebbline/pva/rates"
)

// solvable faults what only the formulas show: a carrying capacity that no
// scale reaches, in the case itself or under one of its options.
func solvable(c *pva.Case) pva.Faults {
	if _, faults := rates.New(c); len(faults) > 0 {
		return faults
	}
	var out pva.Faults
	for i, o := range c.Option {
		with, faults := c.With(o.Set)
		if len(faults) > 0 {
			continue // faulted with the case already
		}
		row := "option." + strconv.Itoa(i+1) + ".set."
		_, faults = rates.New(with)
		for _, f := range faults {
			f.Key = c.Display(row + f.Key)
			f.Path = row + f.Path
			out = append(out, f)
		}
	}
	return out
}
