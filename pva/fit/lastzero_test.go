package fit

import (
	"strings"
	"testing"
)

// TestLastCountOfZero: a population last counted at 0 has no risk of falling and
// no case to start from, whether a 0 is left out or taken as half the smallest
// count; an earlier 0 withholds neither.
func TestLastCountOfZero(t *testing.T) {
	counts := []string{"2000,100", "2001,95", "2002,110", "2003,104", "2004,99", "2005,93", "2006,107", "2007,101", "2008,96", "2009,105", "2010,98", "2011,102", "2012,97"}
	for _, zeros := range []ZeroRule{ZerosMissing, ZerosHalf} {
		for _, last := range []bool{true, false} {
			rows := append([]string{"year,count"}, counts...)
			if last {
				rows = append(rows, "2013,0")
			} else {
				rows[5] = "2004,0"
			}
			s, err := Read("counts.csv", []byte(strings.Join(rows, "\n")+"\n"))
			if err != nil {
				t.Fatal(err)
			}
			r, err := Fit(s, Options{Zeros: zeros})
			if err != nil {
				t.Fatal(err)
			}
			_, caseErr := r.Case(CaseOptions{Breeding: "pulse", Survival: 0.8, Split: 0.5})
			withheld := strings.Contains(r.Risk.Withheld, "the last count is 0")
			refused := caseErr != nil && strings.Contains(caseErr.Error(), "the last one is 0")
			if withheld != last || refused != last {
				t.Errorf("zeros %q, last count 0 %v: risk withheld %v (%s), case refused %v (%v)", zeros, last, withheld, r.Risk.Withheld, refused, caseErr)
			}
		}
	}
}
