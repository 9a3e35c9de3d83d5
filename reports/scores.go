package reports

import (
	"math"
	"strings"

	"ebbline/pva"
	"ebbline/pva/estimate"
)

// scores holds the normal quantile behind the intervals of a report. The
// formulas written into a report are checked against the results they explain:
// a figure whose interval was made in another way keeps its value and gets no
// formula (Cell.by).
type scores struct{ confidence, z float64 }

func newScores(confidence float64) scores {
	return scores{confidence, math.Sqrt2 * math.Erfinv(confidence)}
}

// wilson is the score interval of count successes of n.
func (s scores) wilson(count, n float64) (low, high float64) {
	return estimate.Wilson(int64(count), int64(n), s.confidence)
}

// wilsonFormulas are the same limits as formulas of the cells named (Wilson
// 1927, J. Am. Stat. Assoc. 22:209).
func wilsonFormulas(count, n, z string) (low, high string) {
	const body = "((C+Z^2/2)@Z*SQRT(C*(N-C)/N+Z^2/4))/(N+Z^2)"
	fill := func(sign string) string {
		return fillLetters(strings.Replace(body, "@", sign, 1), map[string]string{"C": count, "N": n, "Z": z})
	}
	return "MAX(0," + fill("-") + ")", "MIN(1," + fill("+") + ")"
}

// The cells that hold the settings of the intervals, for formulas elsewhere.
const (
	cellReplicates = "{settings:run:replicates}"
	cellZ          = "{settings:run:z}"
	cellLimit      = "{figures:limit:estimate}"
)

// proportion fills the cells of a proportion under the keys given: count, the
// estimate and its interval. The formulas use the row's own count and either the
// run's replicates or the row's own number.
func (s scores) proportion(cells map[string]Cell, p pva.Proportion, count, estimate, low, high, n string) {
	of := float64(p.Of)
	cells[count] = num(float64(p.Count))
	lowValue, highValue := s.wilson(float64(p.Count), of)
	lowFormula, highFormula := wilsonFormulas("{"+count+"}", n, cellZ)
	cells[estimate] = num(p.Estimate).by("{"+count+"}/"+n, float64(p.Count)/of)
	cells[low] = num(p.Low).by(lowFormula, lowValue)
	cells[high] = num(p.High).by(highFormula, highValue)
}

// paired is a paired difference taken apart: this minus the other, with the
// four counts of the replicates.
type paired struct {
	both, onlyThis, onlyOther, neither float64
	this, other                        pva.Proportion
}

func newPaired(this, other pva.Proportion, d pva.Difference) paired {
	both := float64(this.Count - d.OnlyThis)
	return paired{both, float64(d.OnlyThis), float64(d.OnlyOther),
		float64(d.Of) - both - float64(d.OnlyThis) - float64(d.OnlyOther), this, other}
}

// explains says whether Newcombe's method 10 (1998, Stat. Med. 17:2635) on the
// two Wilson intervals gives the limits of the difference.
func (p paired) explains(d pva.Difference, s scores) bool {
	e := estimate.Paired(int64(p.onlyThis), int64(p.onlyOther), int64(p.both), int64(p.neither), s.confidence)
	thisLow, thisHigh := s.wilson(float64(p.this.Count), float64(p.this.Of))
	otherLow, otherHigh := s.wilson(float64(p.other.Count), float64(p.other.Of))
	near := func(a, b float64) bool { return math.Abs(a-b) <= 1e-12 }
	return near(e.Low, d.Low) && near(e.High, d.High) && near(thisLow, p.this.Low) && near(thisHigh, p.this.High) &&
		near(otherLow, p.other.Low) && near(otherHigh, p.other.High)
}

// phi is the correlation between the two outcomes over the replicates, its
// numerator corrected for continuity as method 10 has it.
func (p paired) phi() float64 {
	product := (p.both + p.onlyThis) * (p.onlyOther + p.neither) * (p.both + p.onlyOther) * (p.onlyThis + p.neither)
	if product == 0 {
		return 0
	}
	top := p.both*p.neither - p.onlyThis*p.onlyOther
	if top > 0 {
		top = math.Max(top-(p.both+p.onlyThis+p.onlyOther+p.neither)/2, 0)
	}
	return top / math.Sqrt(product)
}

// phiFormula and limitFormulas say the same in cells, the limits in points.
func phiFormula(both, onlyThis, onlyOther, neither string) string {
	const (
		top     = "IF(A*D>B*C,MAX(A*D-B*C-(A+B+C+D)/2,0),A*D-B*C)"
		product = "(A+B)*(C+D)*(A+C)*(B+D)"
	)
	return fillLetters("IF("+product+"=0,0,"+top+"/SQRT("+product+"))", map[string]string{"A": both, "B": onlyThis, "C": onlyOther, "D": neither})
}

func limitFormulas(this, thisLow, thisHigh, other, otherLow, otherHigh, phi string) (low, high string) {
	letters := map[string]string{"P": this, "L": thisLow, "U": thisHigh, "Q": other, "M": otherLow, "V": otherHigh, "R": phi}
	return fillLetters("MAX(-1,P-Q-SQRT(MAX(0,(P-L)^2-2*R*(P-L)*(V-Q)+(V-Q)^2)))*100", letters),
		fillLetters("MIN(1,P-Q+SQRT(MAX(0,(Q-M)^2-2*R*(Q-M)*(U-P)+(U-P)^2)))*100", letters)
}

// fillLetters replaces each capital that stands alone by what it means; function
// names have more than one letter.
func fillLetters(f string, letters map[string]string) string {
	capital := func(i int) bool { return i >= 0 && i < len(f) && f[i] >= 'A' && f[i] <= 'Z' }
	var b strings.Builder
	for i := 0; i < len(f); i++ {
		if to, ok := letters[f[i:i+1]]; ok && !capital(i-1) && !capital(i+1) {
			b.WriteString(to)
			continue
		}
		b.WriteByte(f[i])
	}
	return b.String()
}
