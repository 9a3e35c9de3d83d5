package fit

import (
	"reflect"
	"strings"
	"testing"
)

// TestRead: the forms that spreadsheets write all give the same series.
func TestRead(t *testing.T) {
	want := []Count{{Year: 1990, Count: 12.5}, {Year: 1991, Count: 14}, {Year: 1994, Count: 9}}
	for name, text := range map[string]string{
		"plain":            "year,count\n1990,12.5\n1991,14\n1994,9\n",
		"byte order mark":  "\xef\xbb\xbfyear,count\n1990,12.5\n1991,14\n1994,9\n",
		"windows lines":    "year,count\r\n1990,12.5\r\n1991,14\r\n1994,9\r\n",
		"old lines":        "year,count\r1990,12.5\r1991,14\r1994,9",
		"semicolons":       "Year; Count\n1990;12,5\n1991;14\n1994;9\n",
		"tabs":             "year\tcount\n1990\t12.5\n1991\t14\n1994\t9\n",
		"quotes":           "\"year\",\"count\"\n\"1990\",\"12.5\"\n1991,14\n1994,9\n",
		"newest first":     "count,year\n9,1994\n14,1991\n12.5,1990\n",
		"remarks and gaps": "# invented\nyear,count,note\n1990,12.5,dry\n1991,14,\n\n1992,,not counted\n1993,NA,\n1994,9,\n",
	} {
		s, err := Read("herons.csv", []byte(text))
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if !reflect.DeepEqual(s.Counts, want) || s.TimeUnit != "year" {
			t.Errorf("%s: %+v", name, s.Counts)
		}
		if gaps := strings.Count(text, "1992") + strings.Count(text, "1993"); s.NotCounted != gaps {
			t.Errorf("%s: %d rows not counted, want %d", name, s.NotCounted, gaps)
		}
	}
	s, err := Read("x.csv", []byte("season,count,se,effort\n1,20,4,2\n2,0,1,3\n"))
	if err != nil || s.TimeUnit != "season" || s.Counts[0] != (Count{1, 20, 0.2, 2}) || s.Counts[1] != (Count{2, 0, 0, 3}) || !s.Errors || !s.Effort {
		t.Errorf("errors and effort: %+v, %v", s, err)
	}
}

// TestReadWrong: every fault names file, line, column, value and a fix, and all
// come together.
func TestReadWrong(t *testing.T) {
	for text, want := range map[string]string{
		"":                                      "x.csv: the file is empty",
		"year,count\n":                          "x.csv: there are no counts",
		"# only a remark\n":                     "x.csv: there is no header row",
		"year,counts\n1990,3\n":                 `x.csv:1:6: "counts" is no column of a series of counts; did you mean count?`,
		"year\n1990\n":                          "x.csv:1:1: there is no column count",
		"count\n3\n":                            "x.csv:1:1: there is no column year",
		"year,count,count\n":                    "is a column given twice",
		"year,hour,count\n":                     "is a second column of dates",
		"year,count,se,cv\n1,2,3,4\n":           "x.csv:1:15: \"cv\" is given beside se",
		"year,count\n1990,twelve\n":             `x.csv:2:6: count: "twelve" is not a number; give a count of 0 or more`,
		"year,count\n1990,12\n19x1,14\n":        `x.csv:3:1: year: "19x1" is not a number`,
		"year,count\n1990,-3\n":                 `x.csv:2:6: count: "-3" is not between 0 and 1e+12`,
		"year,count\n1990,1e13\n":               "is not between 0 and",
		"year,count\n1990,NaN\n":                `"NaN" is not a number`,
		"year,count\n1990,Inf\n":                `"Inf" is not a number`,
		"year,count\n1990,0x10\n":               `"0x10" is not a number`,
		"year,count\n1990,1,234\n":              `x.csv:2:8: "234" stands under no column`,
		"year,count\n,5\n":                      "x.csv:2:1: year: is missing",
		"year,count\n1990,5\n1990,6\n":          `x.csv: year: "1990" is given twice`,
		"year,count,cv\n1990,5,\n":              "x.csv:2:8: cv: is missing",
		"year,count,effort\n1990,5,0\n":         `effort: "0" is not between`,
		"year,count\n1990,\"5\n":                "a quote is out of place",
		"year,count\n1990,\x1b[31m5\n":          `x.csv:2:6: count: "\x1b[31m5" is not a number`,
		"\xff\xfey\x00":                         "is not UTF-8",
		"PK\x03\x04":                            "is a workbook",
		"year;count\n1990;1.200\n":              `x.csv:2:6: count: "1.200" may be in thousands or a decimal number; write 1200, or 1,200 with a decimal comma`,
		"year,count\n1990,\"200,5\"\n":          `x.csv:2:6: count: "200,5" is not a number here; write it with a decimal point, or part the columns by semicolons`,
		"Jahr;Anzahl\n1990;3\n":                 `"Jahr" is no column`,
		"year;count\nä;1\n1990;é\n":             `x.csv:3:6: count: "é" is not a number`,
		"note;year;count\nöö;1990;é\n":          `x.csv:2:9: count: "é"`,
		strings.Repeat("x", largestFile+1):      "larger than 1 MB",
		"year,count\n" + manyRows(mostCounts+1): "more than 1000 rows",
	} {
		s, err := Read("x.csv", []byte(text))
		if err == nil {
			t.Errorf("%.40q is read as %+v", text, s)
			continue
		}
		if !strings.Contains(err.Error(), want) {
			t.Errorf("%.40q: %v\n  want %s", text, err, want)
		}
		if strings.ContainsAny(err.Error(), "\x1b\xff") {
			t.Errorf("%.40q: the error carries control characters", text)
		}
	}
	_, err := Read("x.csv", []byte("year,count\n1990,a\n1991,b\n1992,3\n1993,c\n"))
	if faults, ok := err.(Faults); !ok || len(faults) != 3 {
		t.Errorf("three faults give %v", err)
	}
}

func manyRows(n int) string {
	var b strings.Builder
	for i := 0; i < n; i++ {
		b.WriteString(dateText(float64(i)) + ",5\n")
	}
	return b.String()
}

// TestZeros: a count of 0 is refused until it is said what it means.
func TestZeros(t *testing.T) {
	s, err := Read("x.csv", []byte("year,count\n1,8\n2,0\n3,6\n4,4\n5,7\n"))
	if err != nil {
		t.Fatal(err)
	}
	if _, err := Fit(s, Options{}); err == nil || !strings.Contains(err.Error(), "2 has a count of 0") || !strings.Contains(err.Error(), "--zeros missing") {
		t.Errorf("zeros without a rule: %v", err)
	}
	missing, err := Fit(s, Options{Zeros: ZerosMissing, Resamples: 100})
	if err != nil || missing.Counts != 4 || missing.p.tau(0) != 2 {
		t.Errorf("zeros left out: %+v, %v", missing, err)
	}
	half, err := Fit(s, Options{Zeros: ZerosHalf, Resamples: 100})
	if err != nil || half.Counts != 5 || half.p.n[1] != 2 {
		t.Errorf("zeros at half of the smallest: %+v, %v", half, err)
	}
	if !strings.Contains(half.Doubts[0].Text, "counts of 0 (2)") {
		t.Errorf("no doubt about the zero: %v", half.Doubts)
	}
	if _, err := Fit(s, Options{Zeros: "maybe"}); err == nil {
		t.Error("an unknown rule is taken")
	}
	last := &Series{File: "x", TimeUnit: "year", Counts: append(append([]Count{}, s.Counts...), Count{Year: 6, Count: 0})}
	gone, err := Fit(last, Options{Zeros: ZerosMissing, Resamples: 100})
	if err != nil {
		t.Fatal(err)
	}
	if _, err := gone.Case(CaseOptions{Breeding: "pulse", Survival: 0.5}); err == nil {
		t.Error("a case is made of a population that is gone")
	}
}

// TestTooFew: below four counts there is no answer, below ten no risk and no
// case, each with the reason.
func TestTooFew(t *testing.T) {
	series := func(n int) *Series {
		s := &Series{File: "x", TimeUnit: "year"}
		for i := 0; i < n; i++ {
			s.Counts = append(s.Counts, Count{Year: float64(2000 + i), Count: float64(50 + 7*(i%3) - i)})
		}
		return s
	}
	if _, err := Fit(series(3), Options{}); err == nil || !strings.Contains(err.Error(), "at least 4 are needed") {
		t.Errorf("three counts: %v", err)
	}
	for n, withheld := range map[int]bool{4: true, 9: true, 12: false} {
		r, err := Fit(series(n), Options{Resamples: 100})
		if err != nil {
			t.Fatal(n, err)
		}
		few := strings.Contains(r.Risk.Withheld, "too few for a risk (at least 10)")
		if few != withheld {
			t.Errorf("%d counts: withheld %q", n, r.Risk.Withheld)
		}
		if _, err := r.Case(CaseOptions{Breeding: "pulse", Survival: 0.5, Split: 0.5}); withheld && (err == nil || !strings.Contains(err.Error(), "too few for a case")) {
			t.Errorf("%d counts: case: %v", n, err)
		}
	}
	still := &Series{File: "x", TimeUnit: "year"}
	for i := 0; i < 12; i++ {
		still.Counts = append(still.Counts, Count{Year: float64(i), Count: 20})
	}
	if _, err := Fit(still, Options{}); err == nil || !strings.Contains(err.Error(), "never varies") {
		t.Errorf("counts that never change: %v", err)
	}
	for _, o := range []Options{{Threshold: -1}, {Horizon: -1}, {Horizon: 5000}, {Confidence: 2}, {Resamples: 3}} {
		if _, err := Fit(series(12), o); err == nil {
			t.Errorf("%+v is taken", o)
		}
	}
}

// TestOutlying: a year in which seven tenths are lost stands out of quiet ones
// and is a candidate catastrophe; quiet ones alone have none. A trend and a
// change of effort are seen too.
func TestOutlying(t *testing.T) {
	quiet := []float64{1, 1.1, 0.95, 1.02, 1.08, 0.97, 1.03, 0.99, 1.06, 0.93, 1.04, 1.0, 1.07, 0.96, 1.01}
	at := func(shock float64) *Result {
		s := &Series{File: "x", TimeUnit: "year"}
		n := 1000.0
		for i, g := range quiet {
			n *= g
			if i == 8 {
				n *= shock
			}
			s.Counts = append(s.Counts, Count{Year: float64(2000 + i), Count: n})
		}
		r, err := Fit(s, Options{Resamples: 100})
		if err != nil {
			t.Fatal(err)
		}
		return r
	}
	if o := at(1).Diagnostics.Outlying; len(o) != 0 {
		t.Errorf("quiet years have %+v", o)
	}
	o := at(0.3).Diagnostics.Outlying
	if len(o) != 1 || o[0].From != 2007 || o[0].To != 2008 || !o[0].Down {
		t.Errorf("a crash in 2008 gives %+v", o)
	}
	if o := at(3).Diagnostics.Outlying; len(o) != 1 || o[0].Down {
		t.Errorf("a threefold rise gives %+v", o)
	}
	s := &Series{File: "x", TimeUnit: "year", Effort: true}
	for i := range quiet {
		s.Counts = append(s.Counts, Count{Year: float64(i), Count: 100 * quiet[i] * float64(1+i%2), Effort: float64(1 + i%2)})
	}
	r, err := Fit(s, Options{Resamples: 100})
	if err != nil {
		t.Fatal(err)
	}
	for i, n := range r.p.n { // in proportion to effort, at the mean effort
		agreeTo(t, "corrected count", n, 100*quiet[i]*r.MeanEffort, 1e-12)
	}
}

// FuzzRead: no input crashes the reading, and what is read can be fitted or is
// refused with a reason.
func FuzzRead(f *testing.F) {
	for _, s := range []string{"year,count\n1990,12\n1991,14\n1992,9\n1993,11\n", "year;count;cv\n1;2,5;0,1\n2;3;0,2\n", "year,count\n1,\"", "a\x00b\n1,2"} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		s, err := Read("x.csv", data)
		if err != nil {
			if err.Error() == "" {
				t.Error("an error without words")
			}
			return
		}
		if _, err := Fit(s, Options{Zeros: ZerosMissing, Resamples: 100, Horizon: 3}); err != nil && err.Error() == "" {
			t.Error("an error without words")
		}
	})
}
