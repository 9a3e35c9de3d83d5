package text

import (
	"math"
	"strconv"

	"ebbline/pva"
	"ebbline/reports"
)

// uncertainty is what the draws of uncertain inputs say, in a few lines: where
// the risk lies over the draws, what is only noise, and what it goes with. It is
// "" for a case without uncertain inputs.
func uncertainty(a *pva.Assessment) string {
	u := a.Uncertainty
	if u == nil {
		return ""
	}
	out := "\n"
	law := u.Case.Law
	if law.Reason != "" {
		return out + wrap("over "+strconv.Itoa(u.Draws)+" draws of the uncertain inputs: "+law.Reason, "  ", 0)
	}
	p := law.Percentiles
	s := "over " + strconv.Itoa(u.Draws) + " draws of the uncertain inputs the risk is " + reports.Percent(p.P05, 0) + " to " + reports.Percent(p.P95, 0) + " in nine of ten, half of them below " + reports.Percent(p.P50, 0)
	if v := u.Case.Spread; v.Total > 0 && !math.IsNaN(v.Noise) {
		s += "; of the variance between draws " + strconv.FormatFloat(100*(1-v.Inputs/v.Total), 'f', 0, 64) + " % was replicate noise and is taken out"
	}
	out += wrap(s, "  ", 0)
	if links := linkWords(u); links != "" {
		out += wrap("it goes with "+links+" (partial rank correlation)", "  ", 0)
	}
	if u.Stated != nil && u.Stated.Reason == "" {
		out += wrap("at the stated values it is exactly "+reports.Percent(u.Stated.Risk, 0), "  ", 0)
	}
	return out
}

// linkWords lists the inputs whose coefficient is told apart from 0, at most
// three, the strongest first.
func linkWords(u *pva.Uncertainty) string {
	left := append([]pva.UncertainInput(nil), u.Inputs...)
	words := ""
	for n := 0; n < 3; n++ {
		best := -1
		for i, in := range left {
			told := in.Link.Low > 0 || in.Link.High < 0
			if told && (best < 0 || math.Abs(in.Link.Estimate) > math.Abs(left[best].Link.Estimate)) {
				best = i
			}
		}
		if best < 0 {
			break
		}
		if words != "" {
			words += ", "
		}
		words += left[best].Key + " " + strconv.FormatFloat(left[best].Link.Estimate, 'f', 2, 64)
		left = append(left[:best], left[best+1:]...)
	}
	return words
}
